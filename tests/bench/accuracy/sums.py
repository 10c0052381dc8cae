"""Closed sums of powers of n times damped exponentials."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

Complex = NDArray[np.complex128]

_SMALL_STEP = 0.5
_SMALL_TOTAL = 2.0
_SERIES = 40


def power_sums(step: Complex, count: int) -> Complex:
    """(3, ...) sums over n = 0..count-1 of n^k e^(step n), k = 0, 1, 2; real part of step <= 0."""
    step = np.asarray(step, complex)
    folded = step.real + 1j * (np.mod(step.imag + np.pi, 2 * np.pi) - np.pi)
    large = np.abs(folded) > _SMALL_STEP
    return np.where(large, geometric(folded, count), near_integral(folded, count))


def geometric(step: Complex, count: int) -> Complex:
    """By the closed form of the geometric series and its derivatives."""
    z = np.exp(np.where(np.abs(step) > _SMALL_STEP, step, -1.0))
    last = z**count
    d = 1 - z
    s0 = (1 - last) / d
    s1 = z * (1 - last) / d**2 - count * last / d
    s2 = z * (1 + z) * (1 - last) / d**3 - 2 * count * z * last / d**2 - count**2 * last / d
    return np.stack([s0, s1, s2])


def near_integral(step: Complex, count: int) -> Complex:
    """By the formula of Euler and Maclaurin, to the ninth derivative; steps are small."""
    out = []
    for k in range(3):
        total = integral(step, count, k)
        total = total - (term(step, count, k, 0) - term(step, 0, k, 0)) / 2
        for order, factor in ((1, 1 / 12), (3, -1 / 720), (5, 1 / 30240), (7, -1 / 1209600)):
            ends = term(step, count, k, order) - term(step, 0, k, order)
            total = total + factor * ends
        out.append(total)
    return np.stack(out)


def term(step: Complex, n: float, k: int, order: int) -> Complex:
    """The given derivative of n^k e^(step n)."""
    total = np.zeros_like(step)
    for j in range(min(k, order) + 1):
        falling = math.perm(k, j) * float(n) ** (k - j)
        total = total + math.comb(order, j) * falling * step ** (order - j)
    return total * np.exp(step * n)


def integral(step: Complex, count: int, k: int) -> Complex:
    """Of t^k e^(step t) from 0 to count."""
    total = step * count
    small = np.abs(total) < _SMALL_TOTAL
    near = np.where(small, total, 0.0)
    series = sum(near**j / (math.factorial(j) * (k + j + 1)) for j in range(_SERIES))
    s = np.where(small, -1.0, step)
    end = np.exp(s * count)
    closed = [
        (end - 1) / s,
        (end * (s * count - 1) + 1) / s**2,
        (end * ((s * count) ** 2 - 2 * s * count + 2) - 2) / s**3,
    ][k]
    return np.where(small, series * float(count) ** (k + 1), closed)
