"""Maximum likelihood of a few poles on the transform bins around them.

The amplitudes are linear and are eliminated (variable projection, Golub and Pereyra 1973; Jacobian
after Kaufman 1975), the poles are found by damped Gauss-Newton steps. Real and imaginary part of
each bin are divided by their standard deviation in noise, so the cost is chi-squared.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.bands import (
    Band,
    combined,
    cosines_sines,
    leftover_columns,
    passive_columns,
    real_rows,
    transforms,
)
from fieldkit.signal.traces import Component

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

_MOST_STEPS = 25
_STEPS_AT_LEAST = 3
_MORE_LIKE_IT = 10.0
"""Steps as good as the next one that may still come."""
CLOSELY = 1e-4
"""Cost a further step would save, over the noise variance, at which a fit stops."""
ROUGHLY = 0.02
"""The same where only the cost matters."""
_RIDGE = 1e-12
_SINGULAR = 1e-15
"""Eigenvalue over the largest below which a direction is not known at all."""
_MOST_DECAY = 0.6
"""Of the angular frequency: what decays faster is no vibration."""
_LOWEST = 0.3
"""Turns over the record below which a pole is no vibration but a drift."""


@dataclass(frozen=True)
class Fit:
    """A converged fit of the active poles."""

    active: tuple[Component, ...]
    passive: tuple[Component, ...]
    cost: float
    """Chi-squared of the residual."""
    tap_cost: Real
    """(K,) the same by tap."""
    freedom: int
    """Data less parameters."""
    information: Real
    """(2 A, 2 A) Fisher information of (angular frequency, ln decay) of the active poles."""
    tap_information: Real
    """(K, 2 A, 2 A) the same by tap."""
    tap_gradient: Real
    """(K, 2 A) slope of each tap's half cost, for its own poles."""

    @property
    def variance(self) -> float:
        """Residual over expected noise variance."""
        return self.cost / max(self.freedom, 1)


class Still:
    """The columns that do not move during a fit, and the data with them projected out."""

    def __init__(self, bins: Band, passive: Sequence[Component], leftover_terms: int) -> None:
        self.bins = bins
        self.passive = tuple(passive)
        columns = [passive_columns(bins, passive), leftover_columns(bins, leftover_terms)]
        self.rows = real_rows(np.concatenate(columns))
        self.data = real_rows(bins.data[None])[:, 0]
        self.basis = orthonormal(self.rows)[0] if self.rows.shape[1] else None
        self.left = self.clear(self.data[:, None])[:, 0]

    def clear(self, rows: Real) -> Real:
        """(K, C, R) rows less their part in the still columns."""
        return rows if self.basis is None else less_part_in(self.basis, rows)


def fit(
    bins: Band,
    active: Sequence[Component],
    passive: Sequence[Component] = (),
    *,
    leftover_terms: int = 0,
) -> Fit:
    """Fit the active poles; passive ones keep their poles and get new amplitudes.

    ``bins`` must already be free of every other component.
    """
    return fit_before(Still(bins, passive, leftover_terms), active)


def fit_before(
    still: Still,
    active: Sequence[Component],
    enough: float = CLOSELY,
    useful: float = np.inf,
) -> Fit:
    """Fit the active poles, the same in every tap, before a still background.

    The residual cost is a local minimum or, after many steps, close to one. A fit is also left
    where many more steps as good as the next would not bring its cost down to a ``useful`` one.
    """
    omega = np.array([p.pole.imag for p in active])
    decay = np.array([p.decay_per_s for p in active])
    point, damping = Point.at(still, omega, decay), 1e-3
    for number in range(_MOST_STEPS if len(active) else 0):
        move, promise = point.step(damping)
        if promise < enough * max(point.cost / max(still.bins.rows, 1), 1.0):
            break
        if number >= _STEPS_AT_LEAST and point.cost - _MORE_LIKE_IT * promise > useful:
            break
        trial = Point.at(still, *moved(point.omega, point.decay, move, still.bins))
        if trial.cost < point.cost:
            point, damping = trial, max(damping / 5, 1e-7)
        elif damping > 1e4:
            break
        else:
            damping *= 8
    return point.finished(still, active)


@dataclass(frozen=True)
class Point:
    """The model at one set of active poles: amplitudes, residual, Jacobian."""

    omega: Real
    """(A,) damped angular frequencies."""
    decay: Real
    """(A,)"""
    amplitudes: Complex
    """(A, K)"""
    cost: float
    residual: Real
    """(K, R) with every linear parameter fitted."""
    jacobian: Real
    """(K, 2 A, R) derivative of the model by (omega, ln decay), linear parameters projected out."""

    @classmethod
    def at(cls, still: Still, omega: Real, decay: Real) -> Point:
        """Solve for the amplitudes at these poles."""
        if not len(omega):
            nothing = np.zeros((len(still.left), 0, still.left.shape[1]))
            amplitudes = np.zeros((0, len(still.left)), complex)
            return cls(omega, decay, amplitudes, float(np.sum(still.left**2)), still.left, nothing)
        plain, ramp = transforms(still.bins, poles_of(omega, decay)[:, None])
        basis, to_numbers = orthonormal(still.clear(real_rows(cosines_sines(plain))))
        shares = np.matmul(basis, still.left[:, :, None])[:, :, 0]
        left = less_part_in(basis, still.left[:, None] - shares[:, None] @ basis)
        numbers = np.matmul(to_numbers, shares[:, :, None])[:, :, 0].T
        amplitudes = numbers[::2] + 1j * numbers[1::2]
        tangent = still.clear(real_rows(pole_slopes(ramp, amplitudes, decay)))
        tangent = less_part_in(basis, tangent)
        return cls(omega, decay, amplitudes, float(np.sum(left**2)), left[:, 0], tangent)

    def step(self, damping: float) -> tuple[Real, float]:
        """A damped Gauss-Newton step, and the cost it promises to save."""
        normal = np.matmul(self.jacobian, self.jacobian.transpose(0, 2, 1)).sum(axis=0)
        slope = np.matmul(self.jacobian, self.residual[:, :, None]).sum(axis=0)[:, 0]
        scale = np.diag(normal) + 1e-30
        move = np.linalg.solve(normal + np.diag(damping * scale + 1e-30), slope)
        return move, float(move @ slope)

    def finished(self, still: Still, active: Sequence[Component]) -> Fit:
        """The fit at this point, with the amplitudes of the passive components."""
        information = np.matmul(self.jacobian, self.jacobian.transpose(0, 2, 1))
        poles = poles_of(self.omega, self.decay)
        fitted = tuple(
            replace(part, poles=np.full(still.bins.taps, pole), amplitudes=own)
            for part, pole, own in zip(active, poles, self.amplitudes, strict=True)
        )
        linear = still.bins.taps * (2 * len(poles) + still.rows.shape[1])
        return Fit(
            fitted,
            passive_amplitudes(still, self),
            self.cost,
            np.sum(self.residual**2, axis=1),
            still.bins.rows - linear - 2 * len(poles),
            information.sum(axis=0),
            information,
            np.matmul(self.jacobian, self.residual[:, :, None])[:, :, 0],
        )


def poles_of(omega: Real, decay: Real) -> Complex:
    """(A,) complex poles."""
    return np.asarray(1j * omega - decay, complex)


def pole_slopes(ramp: Complex, amplitudes: Complex, decay: Real) -> Complex:
    """(2 A, K, B) derivatives of the components by angular frequency and by ln decay, in turn."""
    turned = 1j * amplitudes[:, :, None]
    shrunk = (-decay[:, None] * amplitudes)[:, :, None]
    slopes = np.stack([combined(ramp, turned), combined(ramp, shrunk)], axis=1)
    return slopes.reshape(-1, *ramp.shape[2:])


def orthonormal(rows: Real) -> tuple[Real, Real]:
    """(K, C, R) orthonormal basis of each tap's rows, and (K, C, C) from shares to numbers.

    By Cholesky's factor of the normalised products; rows that are nearly alike share one direction.
    """
    products = np.matmul(rows, rows.transpose(0, 2, 1))
    size = np.sqrt(np.diagonal(products, axis1=1, axis2=2))
    scale = 1 / np.where(size > 0, size, 1.0)
    products *= scale[:, :, None] * scale[:, None, :]
    factor = np.linalg.cholesky(products + _RIDGE * np.eye(rows.shape[1]))
    to_basis = np.linalg.inv(factor) * scale[:, None, :]
    return np.matmul(to_basis, rows), to_basis.transpose(0, 2, 1)


def less_part_in(basis: Real, rows: Real) -> Real:
    """(K, C, R) rows less their part in an orthonormal basis."""
    return np.asarray(rows - np.matmul(np.matmul(rows, basis.transpose(0, 2, 1)), basis))


def moved(omega: Real, decay: Real, move: Real, bins: Band) -> tuple[Real, Real]:
    """Poles one step further, each step held within sense and the band."""
    spacing = float(np.max(bins.rate_hz / bins.count)) * 2 * np.pi
    low, high = (2 * np.pi * edge for edge in bins.edges_hz)
    limit = np.maximum(3 * decay, spacing)
    turned = omega + np.minimum(np.maximum(move[::2], -limit), limit)
    turned = np.minimum(np.maximum(turned, max(low, _LOWEST * spacing)), high)
    grown = decay * np.exp(np.minimum(np.maximum(move[1::2], -1.0), 1.0))
    return turned, np.minimum(np.maximum(grown, 1e-4 * spacing), _MOST_DECAY * turned)


def passive_amplitudes(still: Still, point: Point) -> tuple[Component, ...]:
    """Passive components with the amplitudes that go with the active ones."""
    if not still.passive:
        return ()
    poles = poles_of(point.omega, point.decay)[:, None]
    data = still.data
    if len(poles):
        pair = transforms(still.bins, poles)[0]
        own = combined(pair, point.amplitudes[:, :, None]).sum(axis=0)
        data = data - real_rows(own[None])[:, 0]
    basis, to_numbers = orthonormal(still.rows)
    numbers = (to_numbers @ (basis @ data[:, :, None]))[:, :, 0]
    out, at = [], 0
    for part in still.passive:
        width = 4 if part.steady else 2
        mine = numbers[:, at : at + width]
        slopes = mine[:, 2] + 1j * mine[:, 3] if part.steady else part.slopes
        out.append(replace(part, amplitudes=mine[:, 0] + 1j * mine[:, 1], slopes=slopes))
        at += width
    return tuple(out)


def inverse(information: Real) -> Real:
    """Inverse of a Fisher information, or of (K, n, n) of them, also where nearly singular."""
    diagonal = np.diagonal(information, axis1=-2, axis2=-1)
    scale = 1 / np.sqrt(np.maximum(diagonal, 1e-300))
    both = scale[..., :, None] * scale[..., None, :]
    values, vectors = np.linalg.eigh(information * both)
    size = np.abs(values)
    kept = size > _SINGULAR * size.max(axis=-1, keepdims=True, initial=0.0)
    over = np.where(kept, 1 / np.where(kept, values, 1.0), 0.0)
    return np.asarray((vectors * over[..., None, :]) @ np.swapaxes(vectors, -1, -2) * both)
