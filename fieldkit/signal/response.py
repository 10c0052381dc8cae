"""Frequency response from hammer blows: H1, H2 and coherence over the blows, with its unit.

H1 takes all noise to be in the response, H2 all of it in the force; the true value lies between
them (Bendat and Piersol, Random Data, chapter 6). One blow has no coherence: it would be 1 by
identity.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import InputError, Refusal

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

OF_QUANTITY = {
    "acceleration": "accelerance",
    "velocity": "mobility",
    "displacement": "receptance",
    "pressure": "pressure per force",
}
UNITS = {
    "accelerance": "(m/s^2)/N",
    "mobility": "(m/s)/N",
    "receptance": "m/N",
    "pressure per force": "Pa/N",
}
DERIVATIVES = {"receptance": 0, "mobility": 1, "accelerance": 2}
"""Time derivatives of displacement in the response."""
RELATIVE = "relative"
"""Unit where the sensor or the hammer is uncalibrated."""


@dataclass(frozen=True)
class Struck:
    """One blow: force and response from the same moment on."""

    force: Real
    """(n,) the contact alone, zero outside it."""
    response: Real
    """(n,) from before the contact until it has died away, less its rest."""
    ring_s: float
    """From the contact to the end of the record."""


@dataclass(frozen=True)
class FrequencyResponse:
    """Response per force against frequency."""

    frequency_hz: Real
    """(m,) evenly spaced, above 0."""
    h1: Complex
    """(m,) cross spectrum over that of the force."""
    h2: Complex
    """(m,) spectrum of the response over the cross spectrum; as H1 for a single blow."""
    coherence: Real | None
    """(m,) over the blows, 0 to 1; None for one blow."""
    force_power: Real
    """(m,) mean squared magnitude of the force's transform, sample units."""
    quantity: str
    """One of UNITS, or ``response`` where nobody said what the sensor measures."""
    unit: str
    blows: int
    rings_s: tuple[float, ...]
    """Of each blow: from its contact to the end of its record."""
    shares: tuple[float, ...]
    """Of each blow in the average: its squared impulse over that of all."""

    @property
    def calibrated(self) -> bool:
        """Whether the values are in the unit, not relative."""
        return self.unit != RELATIVE


def frequency_response(
    blows: Sequence[Struck],
    rate_hz: float,
    *,
    high_hz: float,
    quantity: str | None = None,
    scale: float | None = None,
    force_scale: float | None = None,
) -> FrequencyResponse:
    """H1, H2 and coherence of one or more blows up to ``high_hz``.

    ``scale`` is SI units per sample unit of the response, ``force_scale`` newtons per sample unit
    of the force; without either of them the values are relative. No window on the response: it is
    recorded until it has died away. Raises Refusal where there is no blow, or one without force.
    """
    from scipy.fft import next_fast_len

    if not blows:
        raise Refusal("no blow has a force to divide by", "tap again with the hammer plugged in")
    count = int(next_fast_len(max(len(b.response) for b in blows), real=True))
    past = int(high_hz * count / rate_hz) + 1
    force_power, response_power, cross = powers(blows, rate_hz, count, past)
    if not np.all(force_power > 0) or not np.all(np.abs(cross) > 0):
        raise Refusal("a blow without any force or response", "check both channels, then tap again")
    known = scale is not None and force_scale is not None and quantity is not None
    factor = (scale or 1.0) / (force_scale or 1.0) if known else 1.0
    name = OF_QUANTITY.get(quantity or "", "response")
    impulses = np.array([np.sum(b.force) for b in blows]) ** 2
    total = float(impulses.sum()) or 1.0
    several = len(blows) > 1
    return FrequencyResponse(
        frequency_hz=np.arange(1, past) * rate_hz / count,
        h1=np.asarray(factor * cross / force_power),
        h2=np.asarray(factor * response_power / np.conj(cross)),
        coherence=np.abs(cross) ** 2 / (force_power * response_power) if several else None,
        force_power=force_power,
        quantity=name,
        unit=UNITS.get(name, RELATIVE) if known else RELATIVE,
        blows=len(blows),
        rings_s=tuple(b.ring_s for b in blows),
        shares=tuple(float(x) / total for x in impulses),
    )


def powers(
    blows: Sequence[Struck], rate_hz: float, count: int, past: int
) -> tuple[Real, Real, Complex]:
    """Mean power of force and response and their cross spectrum at lines 1 to ``past`` - 1."""
    force_power = np.zeros(past - 1)
    response_power = np.zeros(past - 1)
    cross = np.zeros(past - 1, complex)
    for blow in blows:
        force = np.fft.rfft(blow.force, count)[1:past] / rate_hz
        response = np.fft.rfft(blow.response, count)[1:past] / rate_hz
        force_power += np.abs(force) ** 2 / len(blows)
        response_power += np.abs(response) ** 2 / len(blows)
        cross += np.conj(force) * response / len(blows)
    return force_power, response_power, cross


def as_quantity(response: FrequencyResponse, wanted: str) -> FrequencyResponse:
    """Accelerance, mobility or receptance as another of the three.

    Raises InputError where the response is not one of motion.
    """
    if response.quantity not in DERIVATIVES or wanted not in DERIVATIVES:
        raise InputError(
            f"{response.quantity} cannot be turned into {wanted}",
            f"use {', '.join(DERIVATIVES)}, and a sensor of motion",
        )
    steps = DERIVATIVES[wanted] - DERIVATIVES[response.quantity]
    factor = (2j * np.pi * response.frequency_hz) ** steps
    unit = UNITS[wanted] if response.calibrated else RELATIVE
    h1, h2 = factor * response.h1, factor * response.h2
    return replace(response, h1=h1, h2=h2, quantity=wanted, unit=unit)


def coherence_near(
    response: FrequencyResponse, frequency_hz: float, width_hz: float
) -> float | None:
    """Mean coherence over the lines within half a width of a frequency, the nearest at least.

    None for a single blow.
    """
    if response.coherence is None:
        return None
    away = np.abs(response.frequency_hz - frequency_hz)
    near = away <= max(width_hz / 2, float(away.min()))
    return float(np.mean(response.coherence[near]))
