"""How sure frequency and damping are: from the likelihood, and from how well the taps agree."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.polish import Fitted

Real = NDArray[np.float64]

_PRIOR_FREEDOM = 20.0
_CHANCE_OF_SCATTER = 0.01


@dataclass(frozen=True)
class Estimate:
    """A value with its standard deviation."""

    value: float
    sd: float


@dataclass(frozen=True)
class PoleEstimate:
    """Natural frequency and damping ratio of one component."""

    frequency_hz: Estimate
    damping_ratio: Estimate
    scattered: bool
    """True where the taps disagree by more than noise explains."""
    tap_frequencies_hz: Real
    """(T,) one for each tap in which it is strong enough."""
    tap_peaks: Real
    """(T,) its amplitude in those taps."""


def pole_estimate(fitted: Fitted, strong: Real) -> PoleEstimate:
    """Values and standard deviations; ``strong`` (K,) says in which taps it stands on its own."""
    part = fitted.part
    cov = inverse(fitted.fit.information) * noise_factor(fitted)
    to_values = values_by_parameters(part.decay_per_s, part.pole.imag)
    at = slice(2 * fitted.place, 2 * fitted.place + 2)
    variance = np.diag(to_values @ cov[at, at] @ to_values.T)
    shared = np.array([part.natural_hz, part.damping_ratio])
    taps, tap_variance = by_tap(fitted, strong, to_values, shared)
    combined = [agreed(shared[i], variance[i], taps[:, i], tap_variance[:, i]) for i in range(2)]
    return PoleEstimate(
        combined[0][0],
        combined[1][0],
        combined[0][1] or combined[1][1],
        taps[:, 0],
        np.abs(part.amplitudes[strong > 0]),
    )


def inverse(information: Real) -> Real:
    """Inverse of a Fisher information, also where it is nearly singular."""
    scale = np.sqrt(np.maximum(np.diag(information), 1e-300))
    return np.asarray(
        np.linalg.pinv(information / np.outer(scale, scale), hermitian=True)
        / np.outer(scale, scale)
    )


def noise_factor(fitted: Fitted) -> float:
    """Residual variance over expected, drawn to 1 where few data say so."""
    fit = fitted.fit
    return (fit.cost + _PRIOR_FREEDOM) / (max(fit.freedom, 0) + _PRIOR_FREEDOM)


def values_by_parameters(decay: float, omega: float) -> Real:
    """(2, 2) derivatives of natural frequency and damping ratio by (omega, ln decay)."""
    natural = float(np.hypot(decay, omega))
    zeta = decay / natural
    return np.array(
        [
            [omega / natural / (2 * np.pi), decay**2 / natural / (2 * np.pi)],
            [-zeta * omega / natural**2, zeta * (1 - zeta**2)],
        ]
    )


def by_tap(fitted: Fitted, strong: Real, to_values: Real, shared: Real) -> tuple[Real, Real]:
    """(T, 2) values each strong tap would give on its own, to first order, and their variances."""
    at = slice(2 * fitted.place, 2 * fitted.place + 2)
    values, variances = [], []
    for k in np.flatnonzero(strong):
        cov = inverse(fitted.fit.tap_information[k])
        move = (cov @ fitted.fit.tap_gradient[k])[at]
        values.append(shared + to_values @ move)
        variances.append(np.diag(to_values @ cov[at, at] @ to_values.T) * noise_factor(fitted))
    return np.reshape(values, (-1, 2)), np.reshape(variances, (-1, 2))


def agreed(shared: float, variance: float, taps: Real, within: Real) -> tuple[Estimate, bool]:
    """Shared value unless the taps scatter more than noise; then their random-effects mean.

    DerSimonian and Laird 1986 for the variance between taps, Student's factor for few of them.
    """
    from scipy.special import chdtrc, stdtrit

    count = len(taps)
    if count < 2 or not np.all(within > 0):
        return Estimate(shared, float(np.sqrt(variance))), False
    weight = 1 / within
    mean = weight @ taps / weight.sum()
    spread = float(weight @ (taps - mean) ** 2)
    if chdtrc(count - 1, spread) > _CHANCE_OF_SCATTER:
        return Estimate(shared, float(np.sqrt(variance))), False
    between = (spread - (count - 1)) / (weight.sum() - weight @ weight / weight.sum())
    weight = 1 / (within + between)
    mean = float(weight @ taps / weight.sum())
    student = float(stdtrit(count - 1, 0.975)) / 1.96
    return Estimate(mean, student / float(np.sqrt(weight.sum()))), True
