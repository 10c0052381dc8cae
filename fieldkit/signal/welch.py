"""Averages over overlapping, windowed segments of a long record (Welch 1967)."""

from __future__ import annotations

from collections.abc import Iterator
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
    length: int
    """n, samples of a segment."""


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
    total = PowerSum(window, length)
    for start in starts:
        total.add(signal[start : start + length])
    return total.mean()


class PowerSum:
    """Sum of the power of segments as they come; its work space is made once."""

    def __init__(self, window: Window, length: int) -> None:
        self._weights = window.samples(length)
        self._weighted = np.empty(length)
        self._lines = np.empty(length // 2 + 1, dtype=np.complex128)
        self._squares = np.zeros(2 * len(self._lines))
        self._count = 0

    def add(self, segment: NDArray[np.float64]) -> None:
        """Add the power of one segment (n,), its mean removed."""
        np.subtract(segment, segment.mean(), out=self._weighted)
        self._weighted *= self._weights
        np.fft.rfft(self._weighted, out=self._lines)
        parts = self._lines.view(np.float64)
        np.multiply(parts, parts, out=parts)
        self._squares += parts
        self._count += 1

    def mean(self) -> SegmentPower:
        """What has been added, over the number of segments."""
        total = self._squares[0::2] + self._squares[1::2]
        return SegmentPower(total / max(self._count, 1), self._count, len(self._weights))


class Segments:
    """Segments cut at a constant hop out of a record that arrives in blocks of any length.

    Segment i begins at sample i times the hop; what is left at the end is in none, as in
    ``scipy.signal.welch``.
    """

    def __init__(self, length: int, hop: int) -> None:
        self._length, self._hop = length, hop
        self._waiting = np.empty(2 * length)
        self._count = 0

    def of(self, block: NDArray[np.float64]) -> Iterator[NDArray[np.float64]]:
        """Segments (n,) that the block completes; each holds until the next one is asked for."""
        taken = 0
        while taken < len(block):
            piece = block[taken : taken + len(self._waiting) - self._count]
            self._waiting[self._count : self._count + len(piece)] = piece
            self._count += len(piece)
            taken += len(piece)
            yield from self._complete()

    def _complete(self) -> Iterator[NDArray[np.float64]]:
        first = 0
        while first + self._length <= self._count:
            yield self._waiting[first : first + self._length]
            first += self._hop
        if first:
            self._waiting[: self._count - first] = self._waiting[first : self._count].copy()
            self._count -= first


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
