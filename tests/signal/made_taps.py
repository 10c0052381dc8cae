"""Tap recordings made from known modes: damped exponentials struck by a half-sine contact."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True)
class Made:
    """One simulated mode."""

    frequency_hz: float
    damping_ratio: float
    amplitude: float = 1.0
    """Amplitude right after a blow of strength 1 and no length."""
    phase: float = -np.pi / 2


@dataclass(frozen=True)
class Blow:
    at_s: float
    strength: float = 1.0
    contact_s: float = 0.002


def half_sine(contact_s: float, rate_hz: float) -> NDArray[np.float64]:
    """Contact force of unit impulse, at least one sample long."""
    count = max(round(contact_s * rate_hz), 1)
    force = np.sin(np.pi * (np.arange(count) + 0.5) / count)
    return force / force.sum()


def ringing(
    mode: Made, force: NDArray[np.float64], count: int, rate_hz: float
) -> NDArray[np.float64]:
    """(count,) response of one mode to a force that starts at sample 0; exact after its end."""
    from scipy.signal import fftconvolve

    time_s = np.arange(count) / rate_hz
    natural = 2 * np.pi * mode.frequency_hz
    damped = natural * np.sqrt(1 - mode.damping_ratio**2)
    decay = np.exp(-mode.damping_ratio * natural * time_s)
    free = mode.amplitude * decay * np.cos(damped * time_s + mode.phase)
    return fftconvolve(free, force)[:count]


def coloured(
    rng: np.random.Generator, count: int, rate_hz: float, density: float, exponent: float = 0.0
) -> NDArray[np.float64]:
    """(count,) noise of a one-sided amplitude density at 20 Hz, power falling as f^-exponent."""
    spectrum = np.fft.rfft(rng.standard_normal(count))
    frequency = np.maximum(np.fft.rfftfreq(count, 1 / rate_hz), 0.5)
    spectrum *= (frequency / 20.0) ** (-exponent / 2)
    return density * np.sqrt(rate_hz / 2) * np.fft.irfft(spectrum, count)


def hum(
    count: int, rate_hz: float, frequency_hz: float, amplitudes: Sequence[float], phase: float = 0.7
) -> NDArray[np.float64]:
    """(count,) a steady tone and its multiples."""
    time_s = np.arange(count) / rate_hz
    parts = (
        a * np.cos(2 * np.pi * frequency_hz * (i + 1) * time_s + phase * (i + 1))
        for i, a in enumerate(amplitudes)
    )
    return sum(parts, start=np.zeros(count))


def tap_recording(
    modes: Sequence[Made], blows: Sequence[Blow], duration_s: float, rate_hz: float
) -> NDArray[np.float64]:
    """(n,) noise-free recording of the modes struck by the blows."""
    count = round(duration_s * rate_hz)
    out = np.zeros(count)
    for blow in blows:
        first = round(blow.at_s * rate_hz)
        force = blow.strength * half_sine(blow.contact_s, rate_hz)
        for mode in modes:
            out[first:] += ringing(mode, force, count - first, rate_hz)
    return out
