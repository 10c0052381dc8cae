"""How sure frequency and damping are: from the likelihood, and from how well the taps agree."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.likelihood import Fit, inverse
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
    taps, within = by_tap(fitted, strong)
    loose = bool(fitted.tap_fits) and len(taps) > 1
    if loose:
        (frequency, damping), differs = [agreed(taps[:, i], within[:, i]) for i in range(2)], True
    else:
        shared = shared_estimates(fitted)
        differs = any(disagree(taps[:, i], within[:, i]) for i in range(2))
        mixed = [agreed(taps[:, i], within[:, i]) if differs else shared[i] for i in range(2)]
        frequency, damping = mixed
    peaks = np.abs(fitted.part.amplitudes[strong > 0])
    return PoleEstimate(frequency, damping, differs, taps[:, 0], peaks)


def shared_estimates(fitted: Fitted) -> list[Estimate]:
    """Frequency and damping ratio of the pole shared by the taps."""
    part = fitted.fit.active[fitted.place]
    cov = inverse(fitted.fit.information) * noise_factor(fitted.fit)
    to_values = values_by_parameters(part.decay_per_s, part.pole.imag)
    at = slice(2 * fitted.place, 2 * fitted.place + 2)
    sd = np.sqrt(np.diag(to_values @ cov[at, at] @ to_values.T))
    return [Estimate(part.natural_hz, float(sd[0])), Estimate(part.damping_ratio, float(sd[1]))]


def noise_factor(fit: Fit) -> float:
    """Residual variance over expected, drawn to 1 where few data say so."""
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


def by_tap(fitted: Fitted, strong: Real) -> tuple[Real, Real]:
    """(T, 2) frequency and damping ratio each strong tap gives on its own, and their variances.

    From the fit of each tap where there is one, else to first order from the shared fit.
    """
    at = slice(2 * fitted.place, 2 * fitted.place + 2)
    values, variances = [], []
    for k in np.flatnonzero(strong):
        fit = fitted.tap_fits[k] if fitted.tap_fits else fitted.fit
        part = fit.active[fitted.place]
        row = 0 if fitted.tap_fits else k
        cov = inverse(fit.tap_information[row])
        to_values = values_by_parameters(part.decay_per_s, part.pole.imag)
        move = (cov @ fit.tap_gradient[row])[at]
        values.append(np.array([part.natural_hz, part.damping_ratio]) + to_values @ move)
        variances.append(np.diag(to_values @ cov[at, at] @ to_values.T) * noise_factor(fit))
    return np.reshape(values, (-1, 2)), np.reshape(variances, (-1, 2))


def disagree(taps: Real, within: Real) -> bool:
    """True where taps scatter by more than their own variances explain."""
    from scipy.special import chdtrc

    if len(taps) < 2 or not np.all(within > 0):
        return False
    mean = np.average(taps, weights=1 / within)
    return bool(chdtrc(len(taps) - 1, np.sum((taps - mean) ** 2 / within)) < _CHANCE_OF_SCATTER)


def agreed(taps: Real, within: Real) -> Estimate:
    """Random-effects mean of what the taps say, with Student's factor for few of them.

    DerSimonian and Laird 1986 (from memory) for the variance between taps. Only that is read from
    the taps themselves: how far Student's factor reaches follows from its share of the variance
    (Satterthwaite 1946, from memory).
    """
    from scipy.special import stdtrit

    count = len(taps)
    weight = 1 / within
    spread = float(weight @ (taps - np.average(taps, weights=weight)) ** 2)
    total = weight.sum() - weight @ weight / weight.sum()
    between = max((spread - (count - 1)) / float(total), 0.0)
    weight = 1 / (within + between)
    share = between / count * float(weight.sum())
    student = float(stdtrit((count - 1) / max(share, 1e-3) ** 2, 0.975)) / 1.96
    return Estimate(float(np.average(taps, weights=weight)), student / float(np.sqrt(weight.sum())))
