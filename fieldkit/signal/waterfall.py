"""Frequency against time of a running recording: how its lines move as the speed does.

Even stretches of the recording, overlapping where it is short; each is the mean of a few Hann
segments (Welch), reduced to the highest line of each of a few hundred columns. Memory does not
grow with the length.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import Refusal
from fieldkit.progress import Progress
from fieldkit.signal.source import RecordingSource

Real = NDArray[np.float64]

STRETCHES, COLUMNS = 240, 400
MOST_SEGMENTS = 6
"""Segments of a stretch that its mean is taken over, evenly spread."""
LEAST_S = 2.0
CORNER_HZ = 2.0
STEADY_SHARE = 0.005
"""A line that moves no farther, relative, has kept its frequency (common practice, no source)."""


@dataclass(frozen=True)
class Waterfall:
    """n stretches of time, m columns of frequency."""

    time_s: Real
    """(n,) middle of each stretch."""
    frequency_hz: Real
    """(m,) middle of each column."""
    rms: Real
    """(n, m) RMS of the highest line in each column, in ``unit``."""
    strongest_hz: Real
    """(n,) frequency of the highest line of each stretch, between the lines of the transform."""
    strongest_rms: Real
    """(n,)"""
    resolution_hz: float
    """Distance of two lines of the transform."""
    unit: str

    @property
    def moves(self) -> float:
        """How far the strongest line moves, relative: 5 % to 95 % of its places over the median."""
        low, middle, high = np.quantile(self.strongest_hz, (0.05, 0.5, 0.95))
        return float((high - low) / middle)

    @property
    def steady(self) -> bool:
        """Whether it stays where it is, as finely as it can be told."""
        median = float(np.median(self.strongest_hz))
        return self.moves <= max(STEADY_SHARE, 0.5 * self.resolution_hz / median)


def waterfall(
    source: RecordingSource,
    channel: int = 1,
    *,
    up_to_hz: float,
    scale: float = 1.0,
    unit: str = "sample units",
    progress: Progress | None = None,
) -> Waterfall:
    """Read a whole recording in blocks; ``unit`` is that of sample times ``scale``.

    Raises Refusal where it is too short to tell a line from its neighbours, InputError for a
    channel that is not there, Cancelled where progress says so.
    """
    progress = progress or Progress()
    up_to_hz = min(up_to_hz, 0.5 * source.rate_hz)
    length = _segment_length(source, up_to_hz)
    hop = max(length // 4, -(-source.frames // STRETCHES))
    stretch = max(length, hop)
    window = np.hanning(length + 1)[:-1]
    frequency = np.fft.rfftfreq(length, 1 / source.rate_hz)
    seen = (frequency >= CORNER_HZ) & (frequency <= up_to_hz)
    edges = np.linspace(CORNER_HZ, up_to_hz, min(COLUMNS, int(seen.sum())) + 1)
    starts = np.searchsorted(frequency[seen], edges[:-1])
    rows: list[Real] = []
    strongest: list[tuple[float, float]] = []
    for number, block in enumerate(source.blocks(channel, stretch, stretch - hop)):
        progress.step("reading the recording", min(1.0, number * hop / source.frames))
        if len(block) < length:
            break
        lines: Real = scale * _rms(block, length, window)[seen]
        rows.append(np.asarray(np.maximum.reduceat(lines, starts)))
        strongest.append(_peak(np.asarray(frequency[seen]), lines))
    return Waterfall(
        np.asarray((np.arange(len(rows)) * hop + 0.5 * stretch) / source.rate_hz),
        0.5 * (edges[:-1] + edges[1:]),
        np.stack(rows),
        np.array([hertz for hertz, _ in strongest]),
        np.array([rms for _, rms in strongest]),
        float(frequency[1]),
        unit,
    )


def _segment_length(source: RecordingSource, up_to_hz: float) -> int:
    """As fine as the columns, and no longer than a quarter of a minute."""
    if source.duration_s < LEAST_S:
        raise Refusal(
            f"{source.duration_s:.1f} s are too short to see lines move",
            f"record at least {LEAST_S:g} s, better a minute over the change of speed",
        )
    wanted_s = min(max(COLUMNS / up_to_hz, LEAST_S), 8.0, source.duration_s)
    return int(wanted_s * source.rate_hz) // 2 * 2


def _rms(block: Real, length: int, window: Real) -> Real:
    """RMS of a steady sine at each line, over a few segments of the block."""
    last = len(block) - length
    count = min(MOST_SEGMENTS, 1 + 2 * last // length)
    power = np.zeros(length // 2 + 1)
    for first in np.linspace(0, last, count).astype(int):
        segment = block[first : first + length]
        power += np.abs(np.fft.rfft((segment - segment.mean()) * window)) ** 2
    return np.asarray(np.sqrt(2 * power / count) / window.sum())


def _peak(frequency: Real, lines: Real) -> tuple[float, float]:
    """The highest line, placed between its neighbours by a parabola through their logarithms."""
    i = int(np.argmax(lines))
    if not 0 < i < len(lines) - 1 or not (lines[i - 1 : i + 2] > 0).all():
        return float(frequency[i]), float(lines[i])
    before, here, after = np.log(lines[i - 1 : i + 2])
    bend = before - 2 * here + after
    shift = 0.5 * (before - after) / bend if bend < 0 else 0.0
    return float(frequency[i] + shift * (frequency[1] - frequency[0])), float(lines[i])
