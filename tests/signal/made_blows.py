"""Hammer blows on known modes: force and acceleration in closed form, nothing sampled or filtered.

A half-sine force F sin(W t), 0 <= t <= T, W = pi / T, convolved with exp(p t) is
F (W exp(p t) - p sin(W t) - W cos(W t)) / (p^2 + W^2) while it acts, and decays freely after it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]


@dataclass(frozen=True)
class Vibrating:
    """One mode as it is felt between sensor and hammer."""

    frequency_hz: float
    damping_ratio: float
    constant: float
    """Shape at sensor times shape at hammer over modal mass, 1/kg."""

    def accelerance(self, frequency_hz: Real) -> NDArray[np.complex128]:
        """-w^2 R / (w_n^2 - w^2 + 2 i zeta w_n w): the textbook form."""
        w, wn = 2 * np.pi * frequency_hz, 2 * np.pi * self.frequency_hz
        return -(w**2) * self.constant / (wn**2 - w**2 + 2j * self.damping_ratio * wn * w)


@dataclass(frozen=True)
class HalfSine:
    """One hit."""

    at_s: float
    peak_n: float = 100.0
    contact_s: float = 0.004

    def force(self, time_s: Real) -> Real:
        """(n,) newtons."""
        t = time_s - self.at_s
        acts = (t >= 0) & (t <= self.contact_s)
        return np.where(acts, self.peak_n * np.sin(np.pi * t / self.contact_s), 0.0)

    def acceleration(self, mode: Vibrating, time_s: Real) -> Real:
        """(n,) m/s^2 of one mode, exact."""
        first = int(np.searchsorted(time_s, self.at_s))
        t = time_s[first:] - self.at_s
        wn, zeta = 2 * np.pi * mode.frequency_hz, mode.damping_ratio
        wd, turn = wn * np.sqrt(1 - zeta**2), np.pi / self.contact_s
        p = complex(-zeta * wn, wd)
        u = np.minimum(t, self.contact_s)
        state = turn * np.exp(p * u) - p * np.sin(turn * u) - turn * np.cos(turn * u)
        state *= self.peak_n / (p**2 + turn**2) * np.exp(p * (t - u))
        x, v = state.imag / wd, (p * state).imag / wd
        out = np.zeros(len(time_s))
        pushed = self.force(time_s)[first:]
        out[first:] = mode.constant * (pushed - 2 * zeta * wn * v - wn**2 * x)
        return out


def two_channels(
    modes: Sequence[Vibrating],
    hits: Sequence[HalfSine],
    duration_s: float,
    rate_hz: float,
    *,
    force_noise_n: float = 0.0,
    noise_m_per_s2: float = 0.0,
    seed: int = 0,
) -> tuple[Real, Real]:
    """(n,) force and (n,) acceleration, with white noise of these standard deviations."""
    rng = np.random.default_rng(seed)
    time_s = np.arange(round(duration_s * rate_hz)) / rate_hz
    force = sum((hit.force(time_s) for hit in hits), start=np.zeros(len(time_s)))
    response = sum(
        (hit.acceleration(mode, time_s) for hit in hits for mode in modes),
        start=np.zeros(len(time_s)),
    )
    force = force + force_noise_n * rng.standard_normal(len(time_s))
    return force, response + noise_m_per_s2 * rng.standard_normal(len(time_s))


def accelerance(modes: Sequence[Vibrating], frequency_hz: Real) -> NDArray[np.complex128]:
    """(m,) sum over the modes."""
    return np.sum([mode.accelerance(frequency_hz) for mode in modes], axis=0)
