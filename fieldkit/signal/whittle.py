"""Likelihood of a periodogram under a few modes stirred by random forces on a smooth background.

Every value of the periodogram of a stationary record is exponentially distributed about its
expectation and nearly independent of the others (Whittle 1953, Arkiv foer Matematik 2, 423, from
memory). The expectation is that of the finite record, not the spectrum itself, which keeps
narrow modes unbiased (Sykulski, Olhede, Guillaumin, Lilly and Early 2019, Biometrika 106, 251,
from memory). The correlation function of a mode is a decaying exponential of free amplitude and
phase; phase takes up what other modes and the kind of sensor do to its spectrum.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

_MOST_STEPS = 40
EXACT, ROUGH = 2e-3, 0.3
"""Gain in log-likelihood below which a fit is finished."""
_FORGOTTEN = 30.0
"""A correlation function that decayed this often does not notice the end of the record."""
_STUCK = 1e4


State = tuple[Complex, Real, Real]
"""Poles, amplitudes and background."""


@dataclass(frozen=True)
class Zone:
    """A stretch of the periodogram of one record."""

    frequency_hz: Real
    """(m,) without the bins where a machine line was."""
    power: Real
    """(m,) mean of the periodogram over ``weight`` bins each."""
    weight: Real
    duration_s: float

    @cached_property
    def background(self) -> Real:
        """(m, 3) constant, slope and curvature of what lies under the modes."""
        low, high = self.frequency_hz[0], self.frequency_hz[-1]
        x = (2 * self.frequency_hz - low - high) / (high - low)
        return np.stack([np.ones_like(x), x, x**2 - 1 / 3], axis=1)


@dataclass(frozen=True)
class SpectralFit:
    """Modes and background fitted to a zone."""

    poles: Complex
    """(n,) in 1/s, imaginary part positive."""
    amplitudes: Real
    """(n, 2) height of the peak, and the part of its shape that changes sign there."""
    background: Real
    """(3,)"""
    cost: float
    """Negative log-likelihood."""
    information: Real
    """Fisher information of (omega, ln decay, two amplitudes) for each mode, then background."""
    spectrum: Real
    """(m,) expectation of the periodogram."""


def finite_lorentzian(s: Complex, duration_s: float) -> tuple[Complex, Complex]:
    """Transform of exp(-s t) (1 - t / T) from 0 to T, and its derivative by s."""
    inverse = 1 / s
    square = inverse * inverse
    if s[0].real * duration_s > _FORGOTTEN:
        once = inverse / duration_s
        return inverse * (1 - once), square * (2 * once - 1)
    decayed = np.exp(-s * duration_s)
    value = inverse - (1 - decayed) * square / duration_s
    slope = 2 * (1 - decayed) * square * inverse / duration_s - (1 + decayed) * square
    return value, slope


def mode_columns(frequency_hz: Real, pole: complex, duration_s: float) -> tuple[Real, Real, Real]:
    """(m, 2) spectrum by both amplitudes, and its derivatives by omega and by ln decay."""
    decay = -pole.real
    omega = np.asarray(2j * np.pi * frequency_hz, dtype=complex)
    upper, upper_slope = finite_lorentzian(np.asarray(omega - pole), duration_s)
    lower, lower_slope = finite_lorentzian(np.asarray(omega - pole.conjugate()), duration_s)
    values = decay * _both(upper, lower)
    by_omega = decay * _both(-1j * upper_slope, 1j * lower_slope)
    by_decay = values + decay**2 * _both(upper_slope, lower_slope)
    return values, by_omega, by_decay


def _both(upper: Complex, lower: Complex) -> Real:
    columns = np.empty((len(upper), 2))
    columns[:, 0] = upper.real + lower.real
    columns[:, 1] = lower.imag - upper.imag
    return columns


def spectrum_and_jacobian(
    zone: Zone, poles: Complex, amplitudes: Real, background: Real, others: Real | float
) -> tuple[Real, Real]:
    """(m,) expectation of the periodogram and (m, 4 n + 3) derivatives."""
    smooth = zone.background
    total = others + smooth @ background
    jacobian = np.empty((len(smooth), 4 * len(poles) + smooth.shape[1]))
    for i, (pole, amplitude) in enumerate(zip(poles, amplitudes, strict=True)):
        values, by_omega, by_decay = mode_columns(zone.frequency_hz, pole, zone.duration_s)
        total = total + values @ amplitude
        jacobian[:, 4 * i] = by_omega @ amplitude
        jacobian[:, 4 * i + 1] = by_decay @ amplitude
        jacobian[:, 4 * i + 2 : 4 * i + 4] = values
    jacobian[:, 4 * len(poles) :] = smooth
    return np.asarray(total), jacobian


def cost_of(zone: Zone, spectrum: Real) -> float:
    """Negative log-likelihood; infinite where the spectrum is not above zero everywhere."""
    if spectrum.min() <= 0:
        return float("inf")
    return float(zone.weight @ (np.log(spectrum) + zone.power / spectrum))


def fit_zone(
    zone: Zone,
    poles: Sequence[complex] | Complex,
    others: Real | float = 0.0,
    *,
    finished: float = EXACT,
    start: SpectralFit | None = None,
) -> SpectralFit:
    """Most likely modes near the given poles, on a smooth background, by Fisher scoring.

    ``others`` (m,) is what modes outside the zone add; ``start`` a fit of this zone with the same
    number of modes; ``finished`` the gain in log-likelihood that is no longer worth a step.
    """
    state = (
        _started(zone, np.array(poles, dtype=complex), others)
        if start is None
        else (start.poles, start.amplitudes, start.background)
    )
    here = _Here.at(zone, state, others)
    damping = 1e-3
    for _ in range(_MOST_STEPS):
        there = _Here.at(
            zone, _moved(state, _step(here.information, here.gradient, damping)), others
        )
        if not there.cost < here.cost:
            damping *= 6
            if damping > _STUCK:
                break
            continue
        gain, damping = here.cost - there.cost, max(damping / 6, 1e-6)
        here, state = there, there.state
        if gain < finished:
            break
    return SpectralFit(*here.state, here.cost, here.information, here.spectrum)


@dataclass(frozen=True)
class _Here:
    """The likelihood at one set of parameters."""

    state: State
    spectrum: Real
    cost: float
    information: Real
    gradient: Real

    @classmethod
    def at(cls, zone: Zone, state: State, others: Real | float) -> _Here:
        spectrum, jacobian = spectrum_and_jacobian(zone, *state, others)
        cost = cost_of(zone, spectrum)
        if not np.isfinite(cost):
            return cls(state, spectrum, cost, np.empty((0, 0)), np.empty(0))
        weighted = (zone.weight / spectrum**2)[:, None] * jacobian
        return cls(
            state, spectrum, cost, jacobian.T @ weighted, weighted.T @ (zone.power - spectrum)
        )


def _started(zone: Zone, poles: Complex, others: Real | float) -> State:
    """Peak heights read off the smoothed periodogram over a flat floor: positive everywhere."""
    own = zone.power - 0.9 * np.minimum(others, zone.power)
    floor = max(float(np.quantile(_smooth(own, 9), 0.2)), 1e-6 * float(own.mean()))
    amplitudes = np.zeros((len(poles), 2))
    for i, pole in enumerate(poles):
        frequency_hz, half = abs(pole.imag) / (2 * np.pi), -pole.real / (2 * np.pi)
        near = np.abs(zone.frequency_hz - frequency_hz) < half
        height = float(own[near].mean()) if near.any() else floor
        amplitudes[i, 0] = max(1.3 * (height - floor), 0.2 * floor)
    return poles, amplitudes, np.array([floor, 0.0, 0.0])


def _smooth(values: Real, width: int) -> Real:
    width = min(width, len(values))
    return np.convolve(values, np.full(width, 1 / width), mode="valid")


def _step(information: Real, gradient: Real, damping: float) -> Real:
    scale = 1 / np.sqrt(np.maximum(np.diag(information), 1e-300))
    scaled = information * np.outer(scale, scale)
    scaled.flat[:: len(scaled) + 1] += damping
    return np.asarray(scale * np.linalg.solve(scaled, scale * gradient))


def covariance_of(information: Real) -> Real:
    """Inverse of a Fisher information whose parameters may differ by any power of ten."""
    scale = 1 / np.sqrt(np.maximum(np.diag(information), 1e-300))
    scaled = information * np.outer(scale, scale)
    return np.asarray(np.linalg.pinv(scaled, hermitian=True) * np.outer(scale, scale))


def _moved(state: State, step: Real) -> State:
    """Parameters after a step; a decay rate changes by no more than a factor of two at once."""
    poles, amplitudes, background = state
    by_mode = step[: 4 * len(poles)].reshape(-1, 4)
    decay = -poles.real * np.exp(np.clip(by_mode[:, 1], -0.7, 0.7))
    limit = 2 * -poles.real
    omega = np.abs(poles.imag + np.clip(by_mode[:, 0], -limit, limit))
    moved = -decay + 1j * omega
    return moved, amplitudes + by_mode[:, 2:], background + step[4 * len(poles) :]
