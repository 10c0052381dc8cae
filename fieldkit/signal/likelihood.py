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
    conjugate_pair,
    cosine_sine,
    leftover_columns,
    orthonormal,
    passive_columns,
    pole_slopes,
    real_rows,
)
from fieldkit.signal.traces import Component

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

_MOST_STEPS = 25
_CONVERGED = 1e-3


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


def fit(
    bins: Band,
    active: Sequence[Component],
    passive: Sequence[Component] = (),
    *,
    leftover_terms: int = 0,
    steps: int = _MOST_STEPS,
) -> Fit:
    """Fit the active poles; passive ones keep their poles and get new amplitudes.

    ``bins`` must already be free of every other component. The residual cost is a local minimum or,
    after ``steps`` steps, close to one.
    """
    still = Still(bins, passive, leftover_terms)
    point = Point.at(still, tuple(active))
    damping = 1e-3
    for _ in range(steps if active else 0):
        trial = point.step(still, damping)
        if trial.cost < point.cost:
            gain, point, damping = point.cost - trial.cost, trial, max(damping / 5, 1e-7)
            if gain < _CONVERGED:
                break
        elif damping > 1e4:
            break
        else:
            damping *= 8
    return point.finished(still)


class Still:
    """The columns that do not move during a fit, and the data with them projected out."""

    def __init__(self, bins: Band, passive: Sequence[Component], leftover_terms: int) -> None:
        columns: list[Complex] = []
        for part in passive:
            columns += passive_columns(bins, part)
        self.bins = bins
        self.passive = tuple(passive)
        self.leftover = leftover_columns(bins, leftover_terms)
        self.columns = columns
        self.data = real_rows(bins, [bins.data])[:, :, 0]
        every = columns + self.leftover
        self.basis = orthonormal(real_rows(bins, every)) if every else None
        self.left = self.clear(self.data[:, :, None])[:, :, 0]

    def clear(self, rows: Real) -> Real:
        """Rows less their part in the still columns."""
        if self.basis is None:
            return rows
        return np.asarray(rows - self.basis @ (self.basis.transpose(0, 2, 1) @ rows))


@dataclass(frozen=True)
class Point:
    """The model at one set of active poles: amplitudes, residual, Jacobian."""

    active: tuple[Component, ...]
    cost: float
    residual: Real
    """(K, R) with every linear parameter fitted."""
    jacobian: Real
    """(K, R, P) derivative of the model by the pole parameters, linear parameters projected out."""
    columns: int
    """Linear parameters of one tap that belong to the active poles."""

    @classmethod
    def at(cls, still: Still, active: tuple[Component, ...]) -> Point:
        """Solve for the amplitudes at these poles."""
        bins = still.bins
        if not active:
            return cls(
                (), float(np.sum(still.left**2)), still.left, np.zeros((*still.left.shape, 0)), 0
            )
        pairs = [conjugate_pair(bins, p.poles) for p in active]
        columns = [c for plain, _ in pairs for c in cosine_sine(plain)]
        numbers, basis = solve(still.clear(real_rows(bins, columns)), still.left)
        left = still.left - (basis @ (basis.transpose(0, 2, 1) @ still.left[:, :, None]))[:, :, 0]
        active = tuple(
            replace(p, amplitudes=numbers[:, 2 * i] + 1j * numbers[:, 2 * i + 1])
            for i, p in enumerate(active)
        )
        slopes = [
            s
            for part, (_, ramp) in zip(active, pairs, strict=True)
            for s in pole_slopes(ramp, part, part.amplitudes)
        ]
        tangent = still.clear(real_rows(bins, slopes))
        tangent = tangent - basis @ (basis.transpose(0, 2, 1) @ tangent)
        return cls(active, float(np.sum(left**2)), left, tangent, len(columns))

    def step(self, still: Still, damping: float) -> Point:
        """The point one damped Gauss-Newton step away."""
        normal = np.einsum("krp,krq->pq", self.jacobian, self.jacobian)
        slope = np.einsum("krp,kr->p", self.jacobian, self.residual)
        scale = np.diag(normal) + 1e-30
        move = np.linalg.solve(normal + np.diag(damping * scale + 1e-30), slope)
        return Point.at(still, moved(self.active, move, still.bins))

    def finished(self, still: Still) -> Fit:
        """The fit at this point, with the amplitudes of the passive components."""
        information = np.einsum("krp,krq->kpq", self.jacobian, self.jacobian)
        bins = still.bins
        parameters = self.jacobian.shape[2] + len(bins.count) * (
            self.columns + len(still.columns) + len(still.leftover)
        )
        return Fit(
            self.active,
            passive_amplitudes(still, self.active),
            self.cost,
            np.sum(self.residual**2, axis=1),
            bins.rows - parameters,
            information.sum(axis=0),
            information,
            np.einsum("krp,kr->kp", self.jacobian, self.residual),
        )


def solve(columns: Real, target: Real) -> tuple[Real, Real]:
    """(K, C) least-squares numbers and the (K, R, C) orthonormal basis of the columns."""
    size = np.linalg.norm(columns, axis=1, keepdims=True)
    size = np.where(size > 0, size, 1.0)
    basis, triangle = np.linalg.qr(columns / size)
    ridge = 1e-13 * np.eye(triangle.shape[-1])
    numbers = np.linalg.solve(triangle + ridge, basis.transpose(0, 2, 1) @ target[:, :, None])
    return numbers[:, :, 0] / size[:, 0, :], basis


def moved(active: Sequence[Component], move: Real, bins: Band) -> tuple[Component, ...]:
    """Components with their poles moved, each step held within sense and the band."""
    out, at = [], 0
    spacing = float(np.max(bins.rate_hz / bins.count)) * 2 * np.pi
    top = float(np.min(bins.rate_hz)) * np.pi
    for part in active:
        pole = part.pole
        limit = max(3 * part.decay_per_s, spacing)
        omega = pole.imag + float(np.clip(move[at], -limit, limit))
        omega = float(np.clip(omega, 0.02 * spacing, 0.999 * top))
        decay = part.decay_per_s
        if not part.steady:
            decay *= float(np.exp(np.clip(move[at + 1], -1.0, 1.0)))
            decay = float(np.clip(decay, 1e-4 * spacing, 3 * omega))
        at += 1 if part.steady else 2
        out.append(part.with_pole(complex(-decay, omega)))
    return tuple(out)


def passive_amplitudes(still: Still, active: Sequence[Component]) -> tuple[Component, ...]:
    """Passive components with the amplitudes that go with the active ones."""
    if not still.passive:
        return ()
    bins = still.bins
    columns = still.columns + still.leftover
    own = [c for p in active for c in cosine_sine(conjugate_pair(bins, p.poles)[0])]
    numbers, _ = solve(real_rows(bins, columns + own), still.data)
    out, at = [], 0
    for part in still.passive:
        width = 4 if part.steady else 2
        mine = numbers[:, at : at + width]
        slopes = mine[:, 2] + 1j * mine[:, 3] if part.steady else part.slopes
        out.append(replace(part, amplitudes=mine[:, 0] + 1j * mine[:, 1], slopes=slopes))
        at += width
    return tuple(out)


def inverse(information: Real) -> Real:
    """Inverse of a Fisher information, also where it is nearly singular."""
    scale = np.sqrt(np.maximum(np.diag(information), 1e-300))
    return np.asarray(
        np.linalg.pinv(information / np.outer(scale, scale), hermitian=True)
        / np.outer(scale, scale)
    )
