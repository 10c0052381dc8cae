"""What a recording holds besides the modes: noise of known density and steady tones."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]

_LEAST_HZ = 0.3


@dataclass(frozen=True)
class Density:
    """One-sided power density of noise: a sum of power laws, through a high-pass, over a floor."""

    laws: tuple[tuple[float, float], ...]
    """(density at 20 Hz, exponent): power falls as frequency^-exponent."""
    high_pass_hz: float = 0.0
    """Corner of a first-order high-pass that the laws, not the floor, go through."""
    floor: float = 0.0

    def at(self, frequency_hz: Real | float) -> Real:
        """Unit^2/Hz."""
        frequency = np.maximum(np.asarray(frequency_hz, float), _LEAST_HZ)
        total = sum(level * (frequency / 20.0) ** -exponent for level, exponent in self.laws)
        passed = frequency**2 / (frequency**2 + self.high_pass_hz**2)
        return np.asarray(total * passed + self.floor)

    def times(self, gain: float) -> Density:
        """Of the same noise, samples times a gain."""
        laws = tuple((level * gain**2, exponent) for level, exponent in self.laws)
        return Density(laws, self.high_pass_hz, self.floor * gain**2)

    def over(self, floor: float) -> Density:
        """With more white noise beneath, as from a converter."""
        return Density(self.laws, self.high_pass_hz, self.floor + floor)


@dataclass(frozen=True)
class SteadyTone:
    """A line that runs through the whole recording."""

    frequency_hz: float
    amplitude: float
    phase: float = 0.0
    wander: float = 0.0
    """RMS of the slow relative change of frequency."""
    drift_seed: int = 0
    """Orders of one machine wander together."""


def noise(rng: np.random.Generator, count: int, rate_hz: float, density: Density) -> Real:
    """(count,) Gaussian noise of the density."""
    from scipy.fft import irfft, next_fast_len, rfft

    size = next_fast_len(count, real=True)
    spectrum = rfft(rng.standard_normal(size))
    spectrum *= np.sqrt(density.at(np.fft.rfftfreq(size, 1 / rate_hz)) * rate_hz / 2)
    spectrum[0] = 0.0
    return np.asarray(irfft(spectrum, size))[:count]


def tones(lines: Sequence[SteadyTone], count: int, rate_hz: float) -> Real:
    """(count,) sum of the tones."""
    time_s = np.arange(count) / rate_hz
    out = np.zeros(count)
    for line in lines:
        lead = line.wander * drift_s(time_s, line.drift_seed) if line.wander else 0.0
        out += line.amplitude * np.cos(2 * np.pi * line.frequency_hz * (time_s + lead) + line.phase)
    return out


def drift_s(time_s: Real, seed: int) -> Real:
    """Integral of a slow process of unit RMS: what a wandering machine runs ahead of time."""
    rng = np.random.default_rng(seed)
    rates = 2 * np.pi / rng.uniform(5.0, 60.0, 4)
    weights = rng.standard_normal(4)
    weights *= np.sqrt(2) / np.linalg.norm(weights)
    phases = rng.uniform(0, 2 * np.pi, 4)
    parts = zip(rates, weights, phases, strict=True)
    return np.sum([w / r * (np.sin(r * time_s + p) - np.sin(p)) for r, w, p in parts], axis=0)
