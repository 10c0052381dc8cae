"""Find the lines that stand clear in the spectrum of a running machine."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import islice

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.spectrum import HANN_OVERLAP, Spectrum
from fieldkit.signal.steadiness import can_tell, is_steady
from fieldkit.signal.welch import SegmentPower, one_sided, segment_power
from fieldkit.signal.windows import HANN, HFT90D

MOST_LINES = 20
FALSE_LINES = 1e-3
"""Lines expected from white noise alone, in one spectrum."""
LEAST_PROMINENCE = 2.0
"""A line is at least this many times as high as the median around it."""
_TELLING_PROMINENCE = 4.0
"""Below it the noise under a line varies its level too much to call it steady or not."""
_FLOOR_BINS = 64
_AROUND_BINS = 40
_ROUNDING = 1e-9
"""Of the highest line: what is lower may be an error of arithmetic."""
_FLAT_TOP_CLEAR_BINS = 7.0
_VALLEY = 0.5
_VALLEY_BINS = 200.0
_MOST_CANDIDATES = 500
_OVERLAP_CORRELATION = 1 / 36
"""Squared correlation of two Hann segments that overlap by half (Welch 1967)."""


@dataclass(frozen=True)
class RunningLine:
    """A line that stands clear of the spectrum around it."""

    frequency_hz: float
    rms: float
    prominence: float
    """Height over the median of the spectrum around it, as a ratio."""
    steady: bool | None = None
    """Whether its level holds through the record; a resonance stirred by flow and a speed that
    wanders do not. None where it cannot be told."""


@dataclass(frozen=True)
class _Peak:
    bin: float
    """Interpolated place on the frequency axis, in lines."""
    height: float
    """RMS of the sine that reads this high."""


def find_lines(
    signal: NDArray[np.float64],
    rate_hz: float,
    spectrum: Spectrum,
    *,
    scale: float,
    low_hz: float,
    high_hz: float,
) -> tuple[RunningLine, ...]:
    """Lines of a running spectrum of ``signal`` (n,), strongest first, at most MOST_LINES.

    Found and placed on a Hann spectrum of the same segments, whose lines are narrower; levels
    are read from the flat-top spectrum where no other line is near. Bumps on the back of a broad
    peak are left out.
    """
    length = round(rate_hz / spectrum.frequency_hz[1])
    power = segment_power(signal, HANN, length, HANN_OVERLAP)
    found = clear_lines(power, spectrum, scale=scale, low_hz=low_hz, high_hz=high_hz)
    duration_s = len(signal) / rate_hz
    return tuple(
        replace(line, steady=is_steady(signal, rate_hz, line.frequency_hz, apart_hz))
        if tells(line, apart_hz, duration_s)
        else line
        for line, apart_hz in found
    )


def clear_lines(
    power: SegmentPower, spectrum: Spectrum, *, scale: float, low_hz: float, high_hz: float
) -> tuple[tuple[RunningLine, float], ...]:
    """Lines, strongest first, each with the distance to the next one in hertz.

    ``power`` is that of Hann-windowed segments as long as those of the spectrum. Whether they are
    steady is left open.
    """
    length = power.length
    line_hz = float(spectrum.frequency_hz[1])
    mean_square = one_sided(length) * power.mean * (scale / HANN.samples(length).sum()) ** 2
    inside = slice(max(2, int(np.ceil(low_hz / line_hz))), int(high_hz / line_hz) + 1)
    candidates = _candidates(mean_square, inside, power.segments)
    peaks = _distinct([_peak(mean_square, k) for k in candidates], mean_square)
    lines = (_line(peak, peaks, spectrum) for peak in peaks)
    clear = islice((f for f in lines if f[0].prominence >= LEAST_PROMINENCE), MOST_LINES)
    return tuple(sorted(clear, key=lambda found: -found[0].rms))


def tells(line: RunningLine, apart_hz: float, duration_s: float) -> bool:
    """Whether a line stands clear enough of noise and other lines to be called steady or not."""
    clear = line.prominence >= _TELLING_PROMINENCE
    return clear and can_tell(duration_s, line.frequency_hz, apart_hz)


def _candidates(mean_square: NDArray[np.float64], inside: slice, segments: int) -> NDArray[np.intp]:
    """Local maxima that noise with the level around them would not reach, highest first."""
    from scipy.special import gammainccinv, gammaincinv

    start = inside.start
    power = mean_square[inside]
    if len(power) < 3:
        return np.empty(0, dtype=np.intp)
    freedom = 1 + (segments - 1) / (1 + 2 * _OVERLAP_CORRELATION)
    by_chance = gammainccinv(freedom, FALSE_LINES / len(power)) / gammaincinv(freedom, 0.5)
    floor = np.maximum(_floor(power), _ROUNDING**2 * mean_square.max())
    threshold = max(LEAST_PROMINENCE**2, float(by_chance)) * floor
    before, after = mean_square[start - 1 : inside.stop - 1], mean_square[start + 1 :][: len(power)]
    after = np.pad(after, (0, len(power) - len(after)))
    found = np.flatnonzero((power > before) & (power >= after) & (power > threshold))
    highest_first: NDArray[np.intp] = start + found[np.argsort(-power[found])][:_MOST_CANDIDATES]
    return highest_first


def _floor(power: NDArray[np.float64]) -> NDArray[np.float64]:
    """Running median of a power spectrum (m,), from medians of blocks joined by straight lines."""
    blocks = np.array_split(power, max(1, len(power) // _FLOOR_BINS))
    ends = np.cumsum([len(block) for block in blocks])
    centres = [end - (len(block) + 1) / 2 for end, block in zip(ends, blocks, strict=True)]
    return np.interp(np.arange(len(power)), centres, [float(np.median(b)) for b in blocks])


def _peak(mean_square: NDArray[np.float64], k: int) -> _Peak:
    """Place and height of the sine that explains a Hann-windowed line and its higher neighbour."""
    left, right = mean_square[k - 1], mean_square[min(k + 1, len(mean_square) - 1)]
    side = 1 if right >= left else -1
    ratio = float(np.sqrt(max(left, right) / mean_square[k]))
    offset = max(0.0, (2 * ratio - 1) / (ratio + 1))
    height = float(np.sqrt(mean_square[k])) / HANN.response(offset)
    return _Peak(float(k + side * offset), height)


def _distinct(peaks: Sequence[_Peak], mean_square: NDArray[np.float64]) -> list[_Peak]:
    """The peaks, highest first, that are no part of a higher one."""
    kept: list[_Peak] = []
    for peak in peaks:
        if not any(_belongs(peak, higher, mean_square) for higher in kept):
            kept.append(peak)
    return kept


def _belongs(peak: _Peak, higher: _Peak, mean_square: NDArray[np.float64]) -> bool:
    """Whether the spectrum does not fall far enough between two peaks to make them two lines.

    A steady sine has one maximum only: off its top, a Hann window falls from line to line.
    """
    if abs(peak.bin - higher.bin) > _VALLEY_BINS:
        return False
    low, high = sorted((round(peak.bin), round(higher.bin)))
    return float(np.sqrt(mean_square[low : high + 1].min())) > _VALLEY * peak.height


def _line(peak: _Peak, peaks: Sequence[_Peak], spectrum: Spectrum) -> tuple[RunningLine, float]:
    line_hz = float(spectrum.frequency_hz[1])
    apart = min((abs(peak.bin - other.bin) for other in peaks if other is not peak), default=np.inf)
    k = round(peak.bin)
    flat_top = float(spectrum.amplitude[max(0, k - 1) : k + 2].max())
    rms = flat_top if apart >= _FLAT_TOP_CLEAR_BINS else peak.height
    prominence = rms / max(_around(spectrum.amplitude, k), _ROUNDING * rms)
    return RunningLine(peak.bin * line_hz, rms, prominence), apart * line_hz


def _around(amplitude: NDArray[np.float64], k: int) -> float:
    """Median of the spectrum around a line, without the line."""
    clear = HFT90D.half_width_bins + 1
    below = amplitude[max(1, k - _AROUND_BINS) : max(1, k - clear)]
    above = amplitude[k + clear + 1 : k + _AROUND_BINS + 1]
    around = np.concatenate([below, above])
    return float(np.median(around)) if around.size else 0.0
