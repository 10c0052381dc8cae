"""Noise density of what is there without a blow, steady lines left out."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]

_SMOOTHING = 0.25
_LEAST_HALF_WIDTH = 10
_LONGEST_PART_S = 2.0
MEDIAN_OF_MEAN = float(np.log(2))
"""Median over mean of a periodogram value, which is exponentially distributed."""


@dataclass(frozen=True)
class NoiseDensity:
    """One-sided power density against frequency, smooth."""

    frequency_hz: Real
    """(m,) rising, first one above 0."""
    density: Real
    """(m,) unit squared per hertz, all above 0."""
    grids: dict[float, Real] = field(init=False, default_factory=dict, compare=False, repr=False)
    """Densities at multiples of a spacing, kept because each is used in every scan."""

    def at(self, frequency_hz: Real) -> Real:
        """Density at the given frequencies, interpolated on a log scale; flat beyond the ends."""
        return np.asarray(np.exp(np.interp(np.abs(frequency_hz), self.frequency_hz, self.log)))

    def on_grid(self, spacing_hz: float, count: int) -> Real:
        """(count,) density at 0 Hz and the first multiples of a spacing."""
        known = self.grids.get(spacing_hz)
        if known is None or len(known) < count:
            known = self.grids[spacing_hz] = self.at(np.asarray(np.arange(count) * spacing_hz))
        return known[:count]

    def with_lines(self, lines: NoiseDensity | None) -> NoiseDensity:
        """The density with that of narrow lines, 0 between them, added on its finer grid."""
        if lines is None:
            return self
        here = np.flatnonzero(lines.density > 0)
        grid = np.unique(np.concatenate([here - 1, here, here + 1]))
        grid = grid[(grid >= 0) & (grid < len(lines.density))]
        fine_hz = np.union1d(self.frequency_hz, lines.frequency_hz[grid])
        added = np.interp(fine_hz, lines.frequency_hz, lines.density)
        inside = np.isin(fine_hz, lines.frequency_hz[grid])
        return NoiseDensity(fine_hz, self.at(fine_hz) + np.where(inside, added, 0.0))

    @cached_property
    def log(self) -> Real:
        """(m,) natural logarithm of the density."""
        return np.asarray(np.log(self.density))


def noise_density(
    segments: Sequence[Real], rate_hz: float, *, whole: bool = False, top_hz: float = np.inf
) -> NoiseDensity | None:
    """Density from quiet stretches by Welch's method, medians over time and over frequency.

    The median over a window of frequencies passes over lines, which are modelled on their own;
    ``whole`` stretches, not parts of them, keep also the lines of modes narrow. What lies above
    ``top_hz`` is not looked at. None when all stretches together are too short to say anything.
    """
    from scipy.fft import prev_fast_len

    available = max((len(s) for s in segments), default=0)
    part = min(max(available // 6, int(0.5 * rate_hz)), int(_LONGEST_PART_S * rate_hz), available)
    length = prev_fast_len(available if whole else part, real=True) if available else 0
    if length < 32:
        return None
    used = max(int(min(top_hz / rate_hz, 0.5) * length) + 1, 16)
    spectra = [p[:used] for s in segments for p in periodograms(s, length, rate_hz)]
    typical = np.median(np.array(spectra), axis=0)
    frequency_hz = np.arange(1, len(typical)) * rate_hz / length
    return NoiseDensity(frequency_hz, floor_over_frequency(typical[1:]))


def periodograms(samples: Real, length: int, rate_hz: float) -> list[Real]:
    """One-sided Hann periodograms of stretches of ``length`` samples that overlap by half."""
    window = np.hanning(length + 1)[:-1]
    scale = 2 / (rate_hz * np.sum(window**2))
    starts = range(0, len(samples) - length + 1, max(length // 2, 1))
    return [
        scale * np.abs(np.fft.rfft(window * detrended(samples[i : i + length]))) ** 2
        for i in starts
    ]


def detrended(samples: Real) -> Real:
    """Samples less their straight line of least squares."""
    ramp = np.linspace(-1, 1, len(samples))
    slope = samples @ ramp / (ramp @ ramp)
    return np.asarray(samples - samples.mean() - slope * ramp)


def floor_over_frequency(density: Real) -> Real:
    """Running median over a window that widens with frequency, corrected to the mean, never 0."""
    at = floor_centres(len(density))
    half = np.minimum(np.maximum(_LEAST_HALF_WIDTH, (_SMOOTHING * at).astype(int)), at + 2)
    levels = np.array(
        [middle(density[max(i - h, 0) : i + h + 1]) for i, h in zip(at, half, strict=True)]
    )
    mean = levels / MEDIAN_OF_MEAN
    least = max(float(mean.max()) * 1e-14, np.finfo(float).tiny * 1e20)
    bins = np.arange(len(density))
    return np.asarray(np.exp(np.interp(bins, at, smoothed(np.log(np.maximum(mean, least))))))


def middle(values: Real) -> float:
    """Median of a few values, without what a general routine asks first."""
    ranked, half = np.sort(values), len(values) // 2
    return float(ranked[half] if len(values) % 2 else (ranked[half - 1] + ranked[half]) / 2)


def floor_centres(count: int) -> NDArray[np.int64]:
    """Bins at which the floor is evaluated: close together where windows are narrow."""
    at = [0]
    while at[-1] < count - 1:
        at.append(min(count - 1, at[-1] + max(2, int(_SMOOTHING * at[-1] / 2))))
    return np.array(at)


def smoothed(values: Real) -> Real:
    """Values averaged with their neighbours, ends kept."""
    edged = np.pad(values, 1, mode="edge")
    return np.asarray((edged[:-2] + 2 * edged[1:-1] + edged[2:]) / 4)
