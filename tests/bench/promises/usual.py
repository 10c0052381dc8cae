"""The usual way: one model with stiff supports, the smallest change that it says will do.

The same candidates as the program tries, judged on one model without any doubt; with ``scale`` its
frequencies are multiplied by measured over computed frequency of the first mode.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from fieldkit.detune.candidates import Search, generate
from fieldkit.detune.effort import effort
from fieldkit.detune.evidence import Evidence
from fieldkit.detune.excitation import Band, Goal
from fieldkit.detune.field import field
from fieldkit.detune.fixes import Change
from fieldkit.detune.reduced import build
from fieldkit.detune.screen import Scatter
from fieldkit.detune.unknowns import unknowns_of
from fieldkit.progress import Progress
from fieldkit.span.layout import Span, Support
from fieldkit.span.modes import span_modes
from tests.bench.promises.families import Described

STIFF_N_PER_M, STIFF_N_M_PER_RAD = 1e9, 1e9
HELD = {
    "anchor": ("vertical", "lateral", "axial", "rotation"),
    "nozzle": ("vertical", "lateral", "axial", "rotation"),
    "clamp": ("vertical", "lateral", "axial"),
    "u-bolt": ("vertical", "lateral"),
    "guide": ("vertical", "lateral"),
    "rest": ("vertical",),
    "hanger": ("vertical",),
}
"""What a stress model lets each kind hold, rigidly."""


def stiff(span: Span) -> Span:
    """The span as a nominal model has it."""
    return replace(span, supports=tuple(_rigid(support) for support in span.supports))


def _rigid(support: Support) -> Support:
    held = HELD[support.kind]
    value = {axis: STIFF_N_PER_M if axis in held else 0.0 for axis in HELD["anchor"]}
    value["rotation"] = STIFF_N_M_PER_RAD if "rotation" in held else 0.0
    return replace(support, **value)


def measured_over_computed(job: Described, evidence: Evidence) -> float:
    """Of the lowest measured frequency and the lowest computed one of that direction."""
    lowest = evidence.modes[0]
    computed = [
        mode.frequency_hz
        for mode in span_modes(stiff(job.span), job.tapped, 2 * job.up_to_hz)
        if lowest.direction in mode.direction
    ]
    return lowest.frequency_hz / computed[0] if computed else 1.0


def smallest(
    job: Described, bands: tuple[Band, ...], goal: Goal, scale: float = 1.0
) -> Change | None:
    """The smallest change after which the one model is clear of every band."""
    span = stiff(job.span)
    unknowns = unknowns_of(span, (job.tapped, job.running))
    lifted = tuple(replace(b, **_scaled(b, 1 / scale)) for b in bands)
    limit = goal.up_to_hz / scale
    model = build(span, job.running, unknowns, limit)
    seen = field(span, model, np.zeros((1, len(unknowns))))
    search = Search(
        span, seen, lifted, replace(goal, up_to_hz=limit), Scatter(np.ones(1), np.zeros(1))
    )
    clear = [c.change for c in generate(search, Progress()) if c.chance > 0.5]
    return min(clear, key=lambda change: effort(change, span), default=None)


def _scaled(band: Band, factor: float) -> dict[str, float]:
    names = ("low_hz", "high_hz", "avoid_low_hz", "avoid_high_hz")
    return {name: factor * getattr(band, name) for name in names}
