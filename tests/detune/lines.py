"""Spans and evidence the detune tests share: an invented booster line."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache

import numpy as np

from fieldkit.detune.evidence import Evidence
from fieldkit.detune.excitation import Excitation, Goal
from fieldkit.detune.match import match
from fieldkit.detune.matched import Match
from fieldkit.detune.rank import detune
from fieldkit.detune.unknowns import member_span, unknowns_of
from fieldkit.detune.verdict import Detuning
from fieldkit.signal.modes import MeasuredMode
from fieldkit.span.layout import Leg, PointMass, Span, State, Support
from fieldkit.span.materials import material
from fieldkit.span.modes import span_modes
from fieldkit.span.pipes import standard_pipe

TAPPED = State("tapped", (0.0, 0.0))
RUNNING = State("running", (1.0, 1.0), temperature_k=310.0)
UP_TO_HZ = 100.0


def straight() -> Span:
    """Two spans of NPS 3 with a check valve off the centre line."""
    return Span(
        standard_pipe("NPS 3", "40"),
        material("carbon steel"),
        (Leg((1.0, 0.0, 0.0), 8.4),),
        (Support(0.0, "anchor"), Support(4.1, "clamp"), Support(8.4, "u-bolt")),
        (PointMass(2.6, 24.0, "check valve", 0.15, (0.0, 0.0, 0.18)),),
        contents_density_kg_per_m3=998.0,
    )


def riser() -> Span:
    """A riser between two level legs."""
    return Span(
        standard_pipe("NPS 4", "40"),
        material("carbon steel"),
        (
            Leg((1.0, 0.0, 0.0), 3.0),
            Leg((0.0, 0.0, 1.0), 3.5, 0.1524),
            Leg((0.0, 1.0, 0.0), 2.5, 0.1524),
        ),
        (
            Support(0.0, "anchor"),
            Support(2.0, "hanger"),
            Support(4.5, "guide"),
            Support(9.0, "clamp"),
        ),
        (PointMass(7.6, 20.0, "valve", 0.15, (0.0, 0.0, 0.1)),),
        contents_density_kg_per_m3=998.0,
    )


def hidden(span: Span, seed: int) -> Span:
    """A span as it might really be, drawn from the doubts."""
    unknowns = unknowns_of(span, (TAPPED, RUNNING))
    return member_span(span, unknowns, np.random.default_rng(seed).standard_normal(len(unknowns)))


def evidence_of(truth: Span, seed: int, noise: float = 5e-4) -> Evidence:
    """What taps on the hidden span would give, with small errors."""
    rng = np.random.default_rng(seed)
    modes = [
        MeasuredMode(
            mode.frequency_hz * (1 + noise * rng.standard_normal()),
            noise * mode.frequency_hz,
            0.01,
            0.001,
            mode.direction.split("+")[0],
            taps=5,
        )
        for mode in span_modes(truth, TAPPED, UP_TO_HZ)
        if mode.direction != "axial"
    ]
    return Evidence(tuple(modes))


def matched(span: Span, evidence: Evidence) -> Match:
    """The match of a span with evidence."""
    return match(span, TAPPED, RUNNING, evidence, up_to_hz=UP_TO_HZ)


@cache
def booster() -> tuple[Span, Span, Match]:
    """(span, hidden truth, match) of the booster line, computed once."""
    span = straight()
    truth = hidden(span, 5)
    return span, truth, matched(span, evidence_of(truth, 6))


def shaken(frequency_hz: float) -> tuple[Excitation, ...]:
    """A pump that runs right at a frequency."""
    return (Excitation("pump", (0.99 * frequency_hz, 1.02 * frequency_hz), (1.0,)),)


@cache
def booster_answer() -> tuple[Span, Detuning]:
    """(hidden truth, answer) where the pump sits on the lowest running mode."""
    span, truth, found = booster()
    lowest = span_modes(truth, RUNNING, UP_TO_HZ)[0].frequency_hz
    goal = Goal(up_to_hz=UP_TO_HZ)
    return truth, detune(span, TAPPED, RUNNING, found, shaken(lowest), goal)


def frequencies(span: Span, state: State) -> Sequence[float]:
    """Computed frequencies up to the limit."""
    return [mode.frequency_hz for mode in span_modes(span, state, UP_TO_HZ)]
