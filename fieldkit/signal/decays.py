"""Damped exponentials, sampled, and their exact discrete Fourier transforms.

With z = exp(p / fs) and w the angle of a bin per sample, exp(p t) over N samples transforms to
(1 - q^N) / (1 - q) with q = z exp(-iw): no approximation, no filter, no window.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Complex = NDArray[np.complex128]
Real = NDArray[np.float64]

_BLOCK = 128
_NEAR_ONE = 1e-3
"""Of N |1 - q|: below it the geometric sums are taken from their series."""


def geometric(ratio: Complex, last: Complex, count: Real) -> tuple[Complex, Complex]:
    """Sums of q^n and of n q^n over n = 0 .. N - 1, elementwise.

    ``ratio`` is q, ``last`` q^N and ``count`` N, all of shapes that broadcast to that of q.
    """
    gap = 1 - ratio
    if np.all((1 - np.abs(last)) > _NEAR_ONE):
        return away_from_one(ratio, last, count, gap)
    near = np.abs(gap) * count < _NEAR_ONE
    plain, ramp = away_from_one(ratio, last, count, np.where(near, 1.0, gap))
    if not near.any():
        return plain, ramp
    plain_near = count * (1 - gap * (count - 1) / 2 * (1 - gap * (count - 2) / 3))
    second = gap * (3 * count - 1) * (count - 2) / 12
    ramp_near = count * (count - 1) / 2 * (1 - gap * ((2 * count - 1) / 3 - second))
    return np.where(near, plain_near, plain), np.where(near, ramp_near, ramp)


def away_from_one(
    ratio: Complex, last: Complex, count: Real, gap: Complex
) -> tuple[Complex, Complex]:
    """The sums by their closed forms; ``gap`` is 1 - q."""
    over_gap = 1 / gap
    plain = (1 - last) * over_gap
    return plain, (ratio * plain - count * last) * over_gap


def damped(exponent: complex, count: int) -> Complex:
    """(count,) samples exp(exponent * n), by blocks: one multiplication a sample."""
    fine = np.exp(exponent * np.arange(_BLOCK))
    coarse = np.exp(exponent * _BLOCK * np.arange(-(-count // _BLOCK)))
    return np.outer(coarse, fine).ravel()[:count]


def damped_total(exponents: Complex, amplitudes: Complex, slopes: Complex, count: int) -> Real:
    """(count,) real part of the sum of (a + b n) exp(exponent * n) over some (P,) of them.

    By blocks, so that one product of matrices does the work.
    """
    within, starts = np.arange(_BLOCK), _BLOCK * np.arange(-(-count // _BLOCK))
    fine = np.exp(exponents[:, None] * within)
    coarse = np.exp(exponents[:, None] * starts)
    total = real_of_product((amplitudes[:, None] + slopes[:, None] * starts) * coarse, fine)
    sloping = np.flatnonzero(slopes)
    if len(sloping):
        own = slopes[sloping, None] * coarse[sloping]
        total += real_of_product(own, np.asarray(within * fine[sloping], complex))
    return np.asarray(total.ravel()[:count])


def real_of_product(left: Complex, right: Complex) -> Real:
    """(M, N) real part of the product of (P, M), turned over, and (P, N)."""
    return np.asarray(
        np.concatenate([left.real, -left.imag]).T @ np.concatenate([right.real, right.imag])
    )


def damping_without_window(zeta_measured: float, tau_s: float, frequency_hz: float) -> float:
    """Damping ratio with the share of an exponential window exp(-t / tau_s) taken out."""
    return zeta_measured - 1 / (tau_s * 2 * np.pi * frequency_hz)
