"""Which poles are fitted together, over which bins and how long."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from fieldkit.signal.bands import Band, band, subtract
from fieldkit.signal.likelihood import Fit, Still, fit_before
from fieldkit.signal.traces import Component, Trace

DECAYS_USED = 8.0
ENOUGH_DECAYS = 5.5
"""What comes later, 48 dB below the start, tells next to nothing more of a pole."""
_BANDWIDTHS = 16.0
_LEAST_BINS = 16.0
_TOGETHER = 4.0
_MOST_TOGETHER = 5
_ALIKE = 10.0
"""Poles of which one decays so much faster hardly move each other."""
_MOST_BINS = 600.0
_ROWS_PER_PART = 10
"""Real data of one tap for every component with free amplitudes; with fewer they are kept."""
_SHORTEST_S = 0.04
_TONE_SHARE = 0.4
"""A tone's amplitude is fitted anew only over this share of the longest record, else kept."""


def span_s(parts: Sequence[Component], traces: Sequence[Trace]) -> float:
    """How much of the record serves these poles: eight decays of the slowest."""
    return min(wanted_s(parts), max(t.duration_s for t in traces))


def wanted_s(parts: Sequence[Component]) -> float:
    """Eight decays of the slowest of these poles; without end where none decays."""
    slowest = min((p.decay_per_s for p in parts if not p.steady), default=0.0)
    return max(DECAYS_USED / slowest, _SHORTEST_S) if slowest > 0 else np.inf


def limits_hz(parts: Sequence[Component], duration_s: float, top_hz: float) -> tuple[float, float]:
    """Lowest and highest bin used for these poles together."""
    reach = [
        min(max(_BANDWIDTHS * p.half_power_hz, _LEAST_BINS / duration_s), _MOST_BINS / duration_s)
        for p in parts
    ]
    low = min(p.frequency_hz - r for p, r in zip(parts, reach, strict=True))
    high = max(p.frequency_hz + r for p, r in zip(parts, reach, strict=True))
    return max(min(low, top_hz - _LEAST_BINS / duration_s), 0.0), min(high, top_hz)


def overlapping(part: Component, others: Sequence[Component], duration_s: float) -> list[Component]:
    """Modes so near that their poles cannot be fitted one without the other, nearest first."""

    def closeness(other: Component) -> float:
        width = part.half_power_hz + other.half_power_hz + 1 / duration_s
        return abs(other.frequency_hz - part.frequency_hz) / width

    modes = [o for o in others if o is not part and not o.steady and not o.bend]
    near = [o for o in modes if closeness(o) < _TOGETHER and alike(part, o, _ALIKE, duration_s)]
    return sorted(near, key=closeness)[: _MOST_TOGETHER - 1]


def alike(one: Component, other: Component, factor: float, duration_s: float) -> bool:
    """True where neither decays faster than the other by more than a factor, as far as seen."""
    first, second = one.decay_per_s + 1 / duration_s, other.decay_per_s + 1 / duration_s
    return first < factor * second < factor**2 * first


def fit_together(
    traces: Sequence[Trace],
    active: Sequence[Component],
    others: Sequence[Component],
    top_hz: float,
    *,
    leftover_terms: int = 2,
    over: Sequence[Component] | None = None,
) -> Fit:
    """Fit active poles; others inside the band get new amplitudes, those outside are taken out.

    ``over`` sets the bins from other components than the active ones, so that costs compare.
    """
    around = over or active
    still = surroundings(traces, around, others, top_hz, leftover_terms=leftover_terms)
    return fit_before(still, active)


def surroundings(
    traces: Sequence[Trace],
    around: Sequence[Component],
    others: Sequence[Component],
    top_hz: float,
    *,
    leftover_terms: int = 2,
) -> Still:
    """The band around some poles with everything in it that they are fitted beside."""
    bins, passive = prepared(traces, around, others, top_hz)
    terms = leftover_terms if bins.rows > 24 * len(traces) else min(leftover_terms, 1)
    return Still(bins, passive, terms)


def prepared(
    traces: Sequence[Trace],
    around: Sequence[Component],
    others: Sequence[Component],
    top_hz: float,
) -> tuple[Band, list[Component]]:
    """The band around some poles, free of what stands outside, and what else stands inside."""
    duration_s = span_s(around, traces)
    low, high = limits_hz(around, duration_s, top_hz)
    enough_s = ENOUGH_DECAYS / DECAYS_USED * wanted_s(around)
    bins = band(traces, low, high, duration_s, enough_s)
    longest = max(t.duration_s for t in traces)
    free = [o for o in others if not o.steady or duration_s > _TONE_SHARE * longest]
    inside = [o for o in free if low <= o.frequency_hz <= high and not o.bend]
    if _ROWS_PER_PART * (len(inside) + len(around)) * len(traces) > bins.rows:
        inside = []
    kept = {id(o) for o in inside}
    return subtract(bins, [o for o in others if id(o) not in kept]), inside


def needed_gain(rows: int, taps: int, threshold: float) -> float:
    """Gain a further mode must bring: Bayesian information criterion, and never by chance."""
    return max(threshold, (2 + 2 * taps) * float(np.log(max(rows, 2))))
