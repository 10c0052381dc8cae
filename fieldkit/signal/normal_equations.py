"""Normal equations of the amplitudes of some decays, kept so that stretches can be put together."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

_RIDGE = 1e-9


@dataclass(frozen=True)
class Sums:
    """Normal equations of some samples, or of several alternatives at once."""

    gram: Real
    """(..., 2m, 2m)"""
    moment: Real
    """(..., 2m)"""
    energy: float
    count: int

    def __add__(self, other: Sums) -> Sums:
        return Sums(
            self.gram + other.gram,
            self.moment + other.moment,
            self.energy + other.energy,
            self.count + other.count,
        )

    def __sub__(self, other: Sums) -> Sums:
        return Sums(
            self.gram - other.gram,
            self.moment - other.moment,
            self.energy - other.energy,
            self.count - other.count,
        )

    @property
    def solution(self) -> Real:
        """(..., 2m) least-squares amplitudes."""
        size = self.gram.shape[-1]
        mean = np.trace(self.gram, axis1=-2, axis2=-1) / size
        ridge = (_RIDGE * mean[..., None, None] + 1e-300) * np.eye(size)
        return np.asarray(np.linalg.solve(self.gram + ridge, self.moment[..., None])[..., 0])

    @property
    def rest(self) -> Real:
        """(...,) sum of squares that is left."""
        return np.asarray(self.energy - np.sum(self.moment * self.solution, axis=-1))

    def turned(self, factors: Complex) -> Sums:
        """With every mode's amplitude times a factor (s, m), for each of s alternatives."""
        real, imaginary = (each[..., None] * np.eye(factors.shape[1]) for each in split(factors))
        turn = np.concatenate(
            [
                np.concatenate([real, -imaginary], axis=-1),
                np.concatenate([imaginary, real], axis=-1),
            ],
            axis=-2,
        )
        back = np.swapaxes(turn, -1, -2)
        return Sums(back @ self.gram @ turn, back @ self.moment, self.energy, self.count)


def sums(columns: Real, samples: Real) -> Sums:
    """Normal equations of some samples."""
    return Sums(columns.T @ columns, columns.T @ samples, float(samples @ samples), len(samples))


def real_columns(decays: Complex) -> Real:
    """(n, 2m) cosines and sines of decays (n, m)."""
    return np.hstack([decays.real, -decays.imag])


def split(values: Complex) -> tuple[Real, Real]:
    """Real and imaginary parts."""
    return values.real, values.imag
