"""The largest equal spacing of supports at which a line stays clear of every band."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.excitation import Band, clear_of_all
from fieldkit.span.equal_spans import equal_span_hz
from fieldkit.span.layout import Leg, Span, State, Support
from fieldkit.span.spacing import SuggestedSpacing, spacing_by_diameter
from fieldkit.span.supports import KINDS, springs

Array = NDArray[np.float64]

FEWEST_SPANS, MOST_SPANS, USUAL_SPANS = 2, 10, 5
STEPS = 48
LEAST_DIAMETERS, MOST_DIAMETERS = 6.0, 90.0
"""Spacings that are looked at."""
SPREAD_Z = 1.645
"""5 and 95 %."""
LIQUID_KG_PER_M3 = 200.0
"""Contents heavier than this make the line a liquid one in the table of weight-based spacing."""
FIRST_ELEMENTS = 4
RIGID_N_PER_M = 1e11


@dataclass(frozen=True)
class Held:
    """How stiff the supports are in one direction."""

    median_n_per_m: float
    low_n_per_m: float
    """5 %."""
    high_n_per_m: float
    """95 %."""


@dataclass(frozen=True)
class SupportRow:
    """The supports of the row, all alike."""

    kind: str
    vertical: Held
    lateral: Held
    source: str
    """``prior`` or ``tap``."""


@dataclass(frozen=True)
class CurvePoint:
    """First natural frequency at one spacing, the lower of the two planes."""

    spacing_m: float
    frequency_hz: float
    low_hz: float
    """With supports at 5 %."""
    high_hz: float
    """With supports at 95 %."""
    direction: str
    clear: bool
    """Whether every mode up to the limit is outside every band, at the medians."""


@dataclass(frozen=True)
class SpacingAnswer:
    """Frequency against spacing, and the spacing to choose."""

    state: str
    spans: int
    supports: SupportRow
    top_hz: float | None
    """Upper edge, margin included, of the highest band; None without one."""
    curve: tuple[CurvePoint, ...]
    above_m: float | None
    """Largest spacing whose first frequency is above every band; None where none is."""
    above_soft_m: float | None
    """The same with supports as soft as their 5 %."""
    above_rigid_m: float | None
    """The same with supports that do not give."""
    between_m: float | None
    """Largest spacing, beyond ``above_m``, up to the weight-based one, at which every mode lies
    outside the bands; None where none is."""
    by_spans: tuple[tuple[int, float | None], ...]
    """(number of spans, ``above_m``)."""
    weight_based: SuggestedSpacing | None
    liquid: bool

    @property
    def chosen_m(self) -> float | None:
        """The spacing to choose: above every band where that can be had, for it stays clear
        when supports turn out stiffer."""
        return self.above_m if self.above_m is not None else self.between_m

    @property
    def weight_based_m(self) -> float | None:
        """Of this line: liquid or gas."""
        if self.weight_based is None:
            return None
        return self.weight_based.water_m if self.liquid else self.weight_based.gas_m


def prior_row(span: Span, kind: str) -> SupportRow | None:
    """What supports of a kind are worth under level pipe of this size; None where they do not hold
    it both ways."""
    level = Span(
        span.pipe, span.material, (Leg((1.0, 0.0, 0.0), 1.0),), (Support(0.5, kind),)
    )  # fmt: skip
    held = {s.axis: _held(s.stiffness, s.sd_ln) for s in springs(level)}
    if "vertical" not in held or "lateral" not in held:
        return None
    return SupportRow(kind, held["vertical"], held["lateral"], "prior")


def row_kinds() -> tuple[str, ...]:
    """Kinds that can stand in a row under a line."""
    ends = ("anchor", "nozzle", "branch", "brace")
    return tuple(n for n, k in KINDS.items() if k.vertical and k.lateral and n not in ends)


def usual_kind(span: Span) -> str:
    """The kind that the span's own supports mostly are, else a clamp."""
    own = [s.kind for s in span.supports if s.kind in row_kinds()]
    return max(own, key=own.count) if own else "clamp"


def equal_spacing(
    span: Span,
    state: State,
    supports: SupportRow,
    bands: Sequence[Band],
    up_to_hz: float,
    spans: int = USUAL_SPANS,
) -> SpacingAnswer:
    """Frequency against spacing for a number of equal spans, and the spacing that stays clear."""
    diameter = span.pipe.outside_diameter_m
    spacing = np.geomspace(LEAST_DIAMETERS * diameter, MOST_DIAMETERS * diameter, STEPS)
    looked_at = [band for band in bands if band.avoid_low_hz < up_to_hz]
    top_hz = max((band.avoid_high_hz for band in looked_at), default=None)
    modes = [_modes(span, state, spacing, spans, held) for held in _planes(supports)]
    curve = _curve(span, state, spacing, spans, supports, modes, looked_at, up_to_hz)
    suggested = spacing_by_diameter(diameter)
    liquid = state.nominal_fill * span.contents_density_kg_per_m3 > LIQUID_KG_PER_M3
    above = _crossing(spacing, np.array([p.frequency_hz for p in curve]), top_hz)
    limit = MOST_DIAMETERS * diameter
    if suggested is not None:
        limit = suggested.water_m if liquid else suggested.gas_m
    return SpacingAnswer(
        state=state.name,
        spans=spans,
        supports=supports,
        top_hz=top_hz,
        curve=curve,
        above_m=above,
        above_soft_m=_crossing(spacing, np.array([p.low_hz for p in curve]), top_hz),
        above_rigid_m=_crossing(
            spacing, _first(span, state, spacing, spans, RIGID_N_PER_M), top_hz
        ),
        between_m=_between(curve, above, limit) if top_hz is not None else None,
        by_spans=_by_spans(span, state, spacing, supports, top_hz, above),
        weight_based=suggested,
        liquid=liquid,
    )


def _held(median: float, sd_ln: float) -> Held:
    factor = float(np.exp(SPREAD_Z * sd_ln))
    return Held(median, median / factor, median * factor)


def _planes(supports: SupportRow) -> tuple[Held, Held]:
    return supports.vertical, supports.lateral


def _modes(span: Span, state: State, spacing: Array, spans: int, held: Held) -> Array:
    return equal_span_hz(span, state, spacing, spans, np.full(len(spacing), held.median_n_per_m))


def _first(span: Span, state: State, spacing: Array, spans: int, stiffness: float) -> Array:
    """(S,) first frequency in one plane."""
    k = np.full(len(spacing), stiffness)
    return equal_span_hz(span, state, spacing, spans, k, elements=FIRST_ELEMENTS)[:, 0]


def _curve(
    span: Span,
    state: State,
    spacing: Array,
    spans: int,
    supports: SupportRow,
    modes: Sequence[Array],
    bands: Sequence[Band],
    up_to_hz: float,
) -> tuple[CurvePoint, ...]:
    first = np.stack([plane[:, 0] for plane in modes])
    low, high = (
        np.min([_first(span, state, spacing, spans, k) for k in ends], axis=0)
        for ends in zip(*((h.low_n_per_m, h.high_n_per_m) for h in _planes(supports)), strict=True)
    )
    every = np.concatenate(modes, axis=1)
    clear = np.all(clear_of_all(every, bands) | (every > up_to_hz), axis=1)
    lower = np.argmin(first, axis=0)
    return tuple(
        CurvePoint(
            float(at),
            float(first[lower[i], i]),
            float(low[i]),
            float(high[i]),
            ("vertical", "lateral")[lower[i]],
            bool(clear[i]),
        )
        for i, at in enumerate(spacing)
    )


def _crossing(spacing: Array, first_hz: Array, top_hz: float | None) -> float | None:
    """Spacing where a falling frequency meets an edge, interpolated in logarithms; None where it
    is below from the start, or there is no edge. The largest looked at where it stays above."""
    if top_hz is None or first_hz[0] < top_hz:
        return None
    below = np.flatnonzero(first_hz < top_hz)
    if not len(below):
        return float(spacing[-1])
    i = int(below[0])
    x, y = np.log(spacing[i - 1 : i + 1]), np.log(first_hz[i - 1 : i + 1])
    return float(np.exp(np.interp(-np.log(top_hz), -y, x)))


def _between(curve: Sequence[CurvePoint], above: float | None, limit_m: float) -> float | None:
    """Largest spacing looked at that is clear with both of its neighbours."""
    found = [
        here.spacing_m
        for before, here, after in zip(curve, curve[1:], curve[2:], strict=False)
        if before.clear and here.clear and after.clear and here.spacing_m <= limit_m
    ]
    beyond = [at for at in found if above is None or at > 1.05 * above]
    return max(beyond, default=None)


def _by_spans(
    span: Span,
    state: State,
    spacing: Array,
    supports: SupportRow,
    top_hz: float | None,
    above: float | None,
) -> tuple[tuple[int, float | None], ...]:
    """The number of spans changes little: it is looked for near what was found for one number."""
    if top_hz is None:
        return ()
    near = spacing[::6] if above is None else above * np.linspace(0.9, 1.1, 9)
    softer = min(held.median_n_per_m for held in _planes(supports))
    return tuple(
        (n, _crossing(near, _first(span, state, near, n, softer), top_hz))
        for n in range(FEWEST_SPANS, MOST_SPANS + 1)
    )
