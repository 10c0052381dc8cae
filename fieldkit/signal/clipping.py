"""Samples that stand at a rail: the input was driven beyond what it can show."""

from __future__ import annotations

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
    found = [
        flat_top(sign * samples, max(share * peak, 1.01 * step), step)
        for sign in (1.0, -1.0)
        for share in _TOLERANCES
    ]
    if full_scale is not None and peak >= _AT_FULL_SCALE * full_scale:
        found.append(lone_rail(samples, full_scale))
    return max(found, key=len)


def quantum(samples: Real, peak: float) -> float:
    """Smallest step between sample values, as of a converter; never below 1e-7 of the peak."""
    levels = np.unique(samples[: 1 << 16])
    gaps = np.diff(levels)
    smallest = float(gaps.min(initial=np.inf))
    return max(smallest if np.isfinite(smallest) else 0.0, 1e-7 * peak)


def flat_top(samples: Real, tolerance: float, step: float) -> Indices:
    """Samples of runs within a tolerance of the highest value that are entered by a jump.

    Where the tolerance is wider than the converter's step, chance makes short runs: more is asked.
    """
    top = float(samples.max())
    if top <= 0:
        return np.zeros(0, np.intp)
    exact = tolerance < 1.5 * step
    shortest = _SHORTEST_RUN if exact else _SHORTEST_ROUGH_RUN
    at = samples >= top - tolerance
    edges = np.flatnonzero(np.diff(np.concatenate([[0], at.astype(np.int8), [0]])))
    runs = [
        np.arange(first, past)
        for first, past in zip(edges[::2], edges[1::2], strict=True)
        if past - first >= shortest
        and top - lowest_beside(samples, first, past) > _JUMP * tolerance
    ]
    return np.concatenate(runs) if runs else np.zeros(0, np.intp)


def lowest_beside(samples: Real, first: int, past: int) -> float:
    """The lower of the samples just before and just after a run."""
    return min((float(samples[i]) for i in (first - 1, past) if 0 <= i < len(samples)), default=0.0)


def lone_rail(samples: Real, full_scale: float) -> Indices:
    """Samples at full scale, where there are at least three and one is entered by a jump."""
    at_rail = np.abs(samples) >= _AT_FULL_SCALE * full_scale
    jump = np.abs(np.diff(samples, prepend=samples[:1])) > _JUMP_TO_FULL_SCALE * full_scale
    where = np.flatnonzero(at_rail)
    return where if len(where) >= _SHORTEST_RUN and bool(np.any(at_rail & jump)) else where[:0]
