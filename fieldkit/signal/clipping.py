"""Samples that stand at a rail: the input was driven beyond what it can show."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]

_SHORTEST_RUN = 3
_JUMP = 10.0
"""A rail is entered by a jump of so many tolerances; the top of a smooth wave is not."""
_TOLERANCES = (0.0, 3e-4, 2e-3)
"""Of the peak: how far samples at one rail may differ (noise behind the stage that clips)."""
_AT_FULL_SCALE = 0.9995


def clipped_samples(samples: Real, full_scale: float | None) -> int:
    """How many samples stand at a rail, at full scale or below it; 0 where none is clipped."""
    peak = float(np.abs(samples).max(initial=0.0))
    if peak == 0:
        return 0
    step = quantum(samples, peak)
    counts = [
        flat_top(sign * samples, max(share * peak, 1.01 * step))
        for sign in (1.0, -1.0)
        for share in _TOLERANCES
    ]
    at_rail = full_scale is not None and peak >= _AT_FULL_SCALE * full_scale
    return max(counts) if max(counts) > 0 or not at_rail else lone_rail(samples, full_scale or peak)


def quantum(samples: Real, peak: float) -> float:
    """Smallest step between sample values, as of a converter; never below 1e-7 of the peak."""
    levels = np.unique(samples[: 1 << 16])
    gaps = np.diff(levels)
    smallest = float(gaps.min(initial=np.inf))
    return max(smallest if np.isfinite(smallest) else 0.0, 1e-7 * peak)


def flat_top(samples: Real, tolerance: float) -> int:
    """Samples of runs within a tolerance of the highest value that are entered by a jump."""
    top = float(samples.max())
    if top <= 0:
        return 0
    at = samples >= top - tolerance
    edges = np.flatnonzero(np.diff(np.concatenate([[0], at.astype(np.int8), [0]])))
    total = 0
    for first, past in zip(edges[::2], edges[1::2], strict=True):
        sides = [samples[i] for i in (first - 1, past) if 0 <= i < len(samples)]
        jump = top - min(sides, default=top)
        if past - first >= _SHORTEST_RUN and jump > _JUMP * tolerance:
            total += int(past - first)
    return total


def lone_rail(samples: Real, full_scale: float) -> int:
    """Samples exactly at full scale where there are at least three, as of a pulse cut short."""
    count = int(np.count_nonzero(np.abs(samples) >= _AT_FULL_SCALE * full_scale))
    steep = np.abs(np.diff(samples, append=samples[-1:]))
    near = np.abs(samples) >= _AT_FULL_SCALE * full_scale
    entered = near[1:] & (steep[:-1] > 0.01 * full_scale)
    return count if count >= _SHORTEST_RUN and bool(entered.any()) else 0
