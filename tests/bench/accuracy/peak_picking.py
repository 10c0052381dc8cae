"""The usual way, for comparison: averaged spectrum, highest peaks, half-power bandwidth."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]

_PADDED = 4
_PEAKS_PER_MODE = 3


@dataclass(frozen=True)
class Peak:
    frequency_hz: float
    damping_ratio: float


def pick(
    records: Sequence[Real], rate_hz: float, low_hz: float, high_hz: float, modes: int
) -> tuple[Peak, ...]:
    """The highest local peaks of the mean magnitude spectrum, three for every true mode.

    Zero-padded fourfold, frequency by a parabola through three bins of the logarithm, damping from
    the width at the half-power points.
    """
    from scipy.fft import next_fast_len, rfft

    longest = max(len(r) for r in records)
    size = next_fast_len(_PADDED * longest, real=True)
    magnitude = np.mean([np.abs(rfft(r - np.mean(r), size)) for r in records], axis=0)
    step_hz = rate_hz / size
    inside = magnitude[: int(high_hz / step_hz) + 2]
    middle = inside[1:-1]
    local = np.flatnonzero((middle > inside[:-2]) & (middle >= inside[2:])) + 1
    local = local[local * step_hz >= low_hz]
    highest = local[np.argsort(-inside[local])][: _PEAKS_PER_MODE * modes]
    return tuple(peak_at(magnitude, int(k), step_hz) for k in highest)


def peak_at(magnitude: Real, k: int, step_hz: float) -> Peak:
    """Interpolated frequency and half-power damping of one peak."""
    left, centre, right = np.log(magnitude[k - 1 : k + 2])
    shift = 0.5 * (left - right) / (left - 2 * centre + right)
    level = magnitude[k] / np.sqrt(2)
    width = crossing(magnitude, k, 1, level) + crossing(magnitude, k, -1, level)
    frequency = (k + shift) * step_hz
    return Peak(frequency, width * step_hz / (2 * frequency))


def crossing(magnitude: Real, k: int, way: int, level: float) -> float:
    """Bins from a peak to where the spectrum falls through a level."""
    i = k
    while 0 < i < len(magnitude) - 1 and magnitude[i] > level:
        i += way
    above, below = magnitude[i - way], magnitude[i]
    part = (above - level) / (above - below) if above > below else 0.0
    return abs(i - way - k) + float(np.clip(part, 0, 1))
