"""Poles of a vibration that random forces keep up, from its correlation function.

Covariance-driven stochastic subspace identification (Van Overschee and De Moor 1996, Subspace
Identification for Linear Systems, from memory), one frequency band at a time: the spectrum of a
band turned into a correlation function is that of the signal shifted down to zero, so that few
lags hold several decays at 3 Hz as at 300.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

_HALF_BAND = 1.35
"""Upper edge of a band over its centre, and its centre over the lower edge."""
CORE = 1.2
"""The same for the part of a band whose poles are used."""
_SHARED = 1.03
"""Cores overlap by this much, so that no mode falls between two of them."""
_ROLL_OFF = 0.15
_MOST_LAGS = 96
MOST_ORDERS = 18


@dataclass(frozen=True)
class Band:
    """Part of the frequency axis looked at on its own."""

    low_hz: float
    high_hz: float
    core_low_hz: float
    core_high_hz: float


def bands(low_hz: float, high_hz: float) -> Iterator[Band]:
    """Bands whose cores cover low to high."""
    count = max(1, int(np.ceil(np.log(high_hz / low_hz) / (2 * np.log(CORE)))))
    ratio = (high_hz / low_hz) ** (1 / count)
    for i in range(count):
        core_low = low_hz * ratio**i
        centre = core_low * np.sqrt(ratio)
        edges = centre / _HALF_BAND, centre * _HALF_BAND
        yield Band(*edges, core_low / _SHARED, core_low * ratio * _SHARED)


def correlation(power: Real, step_hz: float, band: Band) -> tuple[Complex, float]:
    """(lags,) correlation function of a band shifted to 0 Hz, and the time from lag to lag.

    ``power`` (bins,) is the periodogram from 0 Hz on.
    """
    first = max(1, int(band.low_hz / step_hz))
    last = min(len(power), int(band.high_hz / step_hz) + 1)
    inside = power[first:last]
    weighted = inside * _rolled_off(len(inside))
    return np.fft.ifft(weighted)[: 2 * _MOST_LAGS], 1 / (len(inside) * step_hz)


def _rolled_off(count: int) -> Real:
    """(count,) one in the middle, falling to zero over both ends."""
    edge = np.minimum(np.arange(count) + 0.5, count - 0.5 - np.arange(count)) / (_ROLL_OFF * count)
    return np.asarray(0.5 - 0.5 * np.cos(np.pi * np.minimum(edge, 1.0)))


def poles_by_order(power: Real, step_hz: float, band: Band) -> list[Complex]:
    """Poles in 1/s of a band for each model order from 1 up, decaying ones in the core only."""
    lags, step_s = correlation(power, step_hz, band)
    half = min(_MOST_LAGS, len(lags)) // 2
    if half < 8:
        return []
    rows = np.arange(half)
    hankel = lags[1 + rows[:, None] + rows[None, :-1]]
    left, strength, _ = np.linalg.svd(hankel)
    first = max(1, int(band.low_hz / step_hz)) * step_hz
    found: list[Complex] = []
    for order in range(1, min(MOST_ORDERS, half // 2) + 1):
        observability = left[:, :order] * np.sqrt(strength[:order])
        shift = np.linalg.lstsq(observability[:-1], observability[1:], rcond=None)[0]
        roots = np.linalg.eigvals(shift)
        poles = np.log(roots[np.abs(roots) > 0] + 0j) / step_s
        poles = poles.real + 1j * (np.mod(poles.imag, 2 * np.pi / step_s) + 2 * np.pi * first)
        natural = np.abs(poles) / (2 * np.pi)
        kept = (poles.real < 0) & (natural >= band.core_low_hz) & (natural < band.core_high_hz)
        found.append(np.asarray(poles[kept], dtype=complex))
    return found
