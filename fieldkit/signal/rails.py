"""Samples of one blow that stand at a rail.

A blow decays, so what its highest samples look like tells more than in a whole recording
(``clipping``): two alike between deep drops, or several tops of one height, are a rail.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.clipping import lone_rail

Real = NDArray[np.float64]
Indices = NDArray[np.intp]

_NEAR_TOP = 0.12
"""Of the height: samples so near the highest are looked at."""
_TOLERANCES = (0.0, 1e-4, 3e-4, 1e-3, 3e-3)
"""Of the height: how far samples at one rail may differ (noise behind the stage that clips)."""
_SHORTEST_RUN = 3
_LONG_ROUGH_RUN = 5
_JUMP = 10.0
"""A rail is entered by a jump of so many tolerances; the top of a smooth wave is not."""
_FINE_STEP = 1e-4
_PAIR_JUMP = 0.05
"""Two samples alike to a fine step, with so deep a drop on both sides, are no chance."""
_BAND = 30.0
"""Tops of equal height are weighed against all that come within so many tolerances of it."""
_TOPS_NEEDED = ((1e-5, 3), (5e-4, 4), (2e-3, 6))
"""Up to each tolerance; beyond the last none can be told."""
_MOST_TOPS = 0.6
_UP_TO = 0.8
"""A blow no longer clips in the last part of its stretch; a steady tone does not change there."""
_SOME = 4096


@dataclass(frozen=True)
class Runs:
    """Runs of neighbouring samples near the highest value."""

    first: Indices
    past: Indices
    before: Real
    """How far the sample before each run lies below the highest, over the height."""
    after: Real
    """How far the sample after it does."""

    @property
    def length(self) -> Indices:
        """Samples in each run."""
        return self.past - self.first

    def chosen(self, which: NDArray[np.bool_]) -> Indices:
        """All samples of some runs."""
        parts = [np.arange(a, b) for a, b in zip(self.first[which], self.past[which], strict=True)]
        return np.concatenate(parts) if parts else np.zeros(0, np.intp)


def blow_clipped_at(samples: Real, full_scale: float | None) -> Indices:
    """Where samples stand at a rail, at full scale or below it; empty where none is clipped."""
    if len(samples) < _SHORTEST_RUN:
        return np.zeros(0, np.intp)
    lowest, highest = float(samples.min()), float(samples.max())
    if lowest == highest:
        return np.zeros(0, np.intp)
    middle = float(np.median(samples[:: max(len(samples) // _SOME, 1)]))
    found = [at_rail(samples, 1.0, highest, middle), at_rail(samples, -1.0, lowest, middle)]
    if full_scale is not None:
        found.append(lone_rail(samples, full_scale))
    return max(found, key=len)


def at_rail(samples: Real, sign: float, top: float, middle: float) -> Indices:
    """Samples at the highest value (lowest for sign -1) that stand there as only a rail makes them.

    They do as a run entered by a jump, as a pair alike between deep drops, or as several tops of
    the same height with none just below.
    """
    height = sign * (top - middle)
    if height <= 0:
        return np.zeros(0, np.intp)
    edge = top - sign * _NEAR_TOP * height
    near = np.flatnonzero(samples >= edge if sign > 0 else samples <= edge)
    step = quantum(samples, int(near[0])) / height
    found = [np.zeros(0, np.intp)]
    for share in _TOLERANCES:
        tolerance = max(share, 1.01 * step, 1e-7)
        runs = runs_within(samples, near, top, height, tolerance)
        lasting = lasting_runs(runs, tolerance, exact=tolerance < 1.5 * step)
        if share == 0 and step < _FINE_STEP:
            drop = np.minimum(runs.before, runs.after)
            lasting |= (runs.length >= 2) & (drop > _PAIR_JUMP)
        if not np.any(lasting):
            band = runs_within(samples, near, top, height, min(_BAND * tolerance, _NEAR_TOP))
            lasting = equal_tops(runs, len(band.first), tolerance, len(samples))
        found.append(runs.chosen(lasting))
    return max(found, key=len)


def lasting_runs(runs: Runs, tolerance: float, *, exact: bool) -> NDArray[np.bool_]:
    """(r,) runs that last, entered or left by a jump.

    Where the tolerance is wider than the converter's step, chance makes short runs: those must drop
    on both sides, by more than even the flat top of two waves in opposition does.
    """
    deep = _JUMP * tolerance
    either, both = np.maximum(runs.before, runs.after), np.minimum(runs.before, runs.after)
    long = (runs.length >= (_SHORTEST_RUN if exact else _LONG_ROUGH_RUN)) & (either > deep)
    short = (runs.length >= _SHORTEST_RUN) & (both > max(deep, _PAIR_JUMP))
    return long | short


def equal_tops(runs: Runs, in_band: int, tolerance: float, count: int) -> NDArray[np.bool_]:
    """(r,) runs that are tops of the same height, where hardly any top lies just below it."""
    jumps = np.maximum(runs.before, runs.after) > _JUMP * tolerance
    tops = np.count_nonzero(jumps)
    least = next((needed for upto, needed in _TOPS_NEEDED if tolerance < upto), np.inf)
    steady = runs.past[-1] > _UP_TO * count
    return jumps & (tops >= max(least, _MOST_TOPS * in_band) and not steady)


def runs_within(samples: Real, near: Indices, top: float, height: float, tolerance: float) -> Runs:
    """Runs of samples within a tolerance (of the height) of the top, among those near it."""
    at = near[np.abs(samples[near] - top) <= tolerance * height]
    breaks = np.flatnonzero(np.diff(at) > 1)
    first = at[np.concatenate([[0], breaks + 1])]
    last = at[np.concatenate([breaks, [len(at) - 1]])]
    before, after = np.maximum(first - 1, 0), np.minimum(last + 1, len(samples) - 1)
    depth_before = np.abs(samples[before] - top) / height
    depth_after = np.abs(samples[after] - top) / height
    return Runs(first, last + 1, depth_before, depth_after)


def quantum(samples: Real, about: int) -> float:
    """Smallest step between sample values, as of a converter."""
    first = max(min(about, len(samples) - _SOME), 0)
    gaps = np.diff(np.sort(samples[first : first + _SOME]))
    return float(gaps[gaps > 0].min(initial=float(np.ptp(samples[first : first + _SOME]))))
