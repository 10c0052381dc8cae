"""Samples that stand at a rail: the input was driven beyond what it can show."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]
Indices = NDArray[np.intp]

_SHORTEST_RUN = 3
_SHORTEST_ROUGH_RUN = 5
_JUMP = 10.0
"""A rail is entered by a jump of so many tolerances; the top of a smooth wave is not."""
_TOLERANCES = (0.0, 3e-4, 2e-3)
"""Of the peak: how far samples at one rail may differ (noise behind the stage that clips)."""
_AT_FULL_SCALE = 0.9995
_JUMP_TO_FULL_SCALE = 0.01


def clipped_at(samples: Real, full_scale: float | None) -> Indices:
    """Where samples stand at a rail, at full scale or below it; empty where none is clipped."""
    peak = float(np.abs(samples).max(initial=0.0))
    if peak == 0:
        return np.zeros(0, np.intp)
    step = quantum(samples, peak)
    tolerances = [max(share * peak, 1.01 * step) for share in _TOLERANCES]
    found = [*flat_tops(samples, tolerances, step), *flat_tops(-samples, tolerances, step)]
    if full_scale is not None and peak >= _AT_FULL_SCALE * full_scale:
        found.append(lone_rail(samples, full_scale))
    return max(found, key=len)


def quantum(samples: Real, peak: float) -> float:
    """Smallest step between sample values, as of a converter; never below 1e-7 of the peak."""
    levels = np.unique(samples[: 1 << 16])
    gaps = np.diff(levels)
    smallest = float(gaps.min(initial=np.inf))
    return max(smallest if np.isfinite(smallest) else 0.0, 1e-7 * peak)


def flat_tops(samples: Real, tolerances: Sequence[float], step: float) -> list[Indices]:
    """For each tolerance the samples of runs within it of the highest value."""
    top = float(samples.max())
    if top <= 0:
        return []
    near = np.flatnonzero(samples >= top - max(tolerances))
    return [
        flat_top(samples, near[samples[near] >= top - tolerance], tolerance, step)
        for tolerance in tolerances
    ]


def flat_top(samples: Real, at: Indices, tolerance: float, step: float) -> Indices:
    """Those of the samples ``at`` the top that are in long runs entered by a jump.

    Where the tolerance is wider than the converter's step, chance makes short runs: more is asked.
    """
    exact = tolerance < 1.5 * step
    shortest = _SHORTEST_RUN if exact else _SHORTEST_ROUGH_RUN
    new_run = np.diff(at, prepend=-2) > 1
    first = at[new_run]
    past = at[np.append(np.flatnonzero(new_run)[1:], len(at)) - 1] + 1
    long_enough = past - first >= shortest
    first, past = first[long_enough], past[long_enough]
    depth = float(samples.max()) - lowest_beside(samples, first, past)
    flat = depth > _JUMP * tolerance
    runs = [np.arange(i, j) for i, j in zip(first[flat], past[flat], strict=True)]
    return np.concatenate(runs) if runs else np.zeros(0, np.intp)


def lowest_beside(samples: Real, first: Indices, past: Indices) -> Real:
    """(r,) the lower of the samples just before and just after each run."""
    before = np.where(first > 0, samples[first - 1], np.inf)
    after = np.where(past < len(samples), samples[np.minimum(past, len(samples) - 1)], np.inf)
    lowest = np.minimum(before, after)
    return np.where(np.isfinite(lowest), lowest, 0.0)


def lone_rail(samples: Real, full_scale: float) -> Indices:
    """Samples at full scale, where there are at least three and one is entered by a jump."""
    least = _AT_FULL_SCALE * full_scale
    where = np.flatnonzero((samples >= least) | (samples <= -least))
    jump = np.abs(samples[where] - samples[np.maximum(where - 1, 0)])
    entered = bool(np.any(jump > _JUMP_TO_FULL_SCALE * full_scale))
    return where if len(where) >= _SHORTEST_RUN and entered else where[:0]
