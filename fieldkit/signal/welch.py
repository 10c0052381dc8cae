"""Averages over overlapping, windowed segments of a long record (Welch 1967)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import Refusal
from fieldkit.signal.windows import Window

SHORTEST_SAMPLES = 64
"""A record with fewer has no spectrum worth the name."""
LONGEST_SEGMENT_S = 10.0
"""Longer segments would tell closer lines apart, but no machine holds its speed that well."""
SEGMENTS_WANTED = 4.0
"""Segments that fit into a record side by side, where its length allows."""
LOWEST_LINE = 5.0
"""The lowest frequency of interest lies at least this many lines above zero."""


@dataclass(frozen=True)
class SegmentPower:
    """Power of the transforms of the segments of one record, line by line."""

    mean: NDArray[np.float64]
    """(n // 2 + 1,) mean of the squared magnitude of the windowed transform."""
    segments: int


def segment_length(n: int, rate_hz: float, low_hz: float) -> int:
    """Samples of a segment, for a record of n samples read from ``low_hz`` up.

    Raises Refusal where the record is too short for any spectrum.
    """
    from scipy.fft import next_fast_len

    if n < SHORTEST_SAMPLES:
        raise Refusal(
            f"the record of {n} samples is too short for a spectrum", "record at least 10 s"
        )
    shared_s = min(n / rate_hz / SEGMENTS_WANTED, LONGEST_SEGMENT_S)
    wanted = max(shared_s, LOWEST_LINE / low_hz) * rate_hz
    length = int(min(n, max(SHORTEST_SAMPLES, wanted)))
    fast = int(next_fast_len(length, real=True))
    return fast if fast <= n else length


def segment_power(
    signal: NDArray[np.float64], window: Window, length: int, overlap: float
) -> SegmentPower:
    """Mean power over segments that overlap by at least the given share and cover the record.

    Each segment's mean is removed. One segment at a time is held in memory.
    """
    count = 1 + int(np.ceil((len(signal) - length) / ((1 - overlap) * length)))
    starts = np.linspace(0, len(signal) - length, count).round().astype(int)
    weights = window.samples(length)
    total = np.zeros(length // 2 + 1)
    for start in starts:
        segment = signal[start : start + length]
        total += np.abs(np.fft.rfft((segment - segment.mean()) * weights)) ** 2
    return SegmentPower(total / count, count)


def one_sided(length: int) -> NDArray[np.float64]:
    """How often each line of a real transform (n // 2 + 1,) counts: twice, but for 0 and n/2."""
    counts = np.full(length // 2 + 1, 2.0)
    counts[0] = 1.0
    if length % 2 == 0:
        counts[-1] = 1.0
    return counts


def line_frequencies(length: int, rate_hz: float) -> NDArray[np.float64]:
    """Frequencies (n // 2 + 1,) in Hz of the lines of a real transform."""
    return np.arange(length // 2 + 1, dtype=np.float64) * rate_hz / length
