"""Whether a fix clears the bands: counted at the band edges, nothing solved.

With receptance G(w) at the rows where springs and masses D(w) = k - w^2 m are put on, the number
of natural frequencies below w becomes N + pos(D^-1 + G) - pos(D^-1), pos counting positive
eigenvalues: the law of inertia applied to the bordered matrix (Haynsworth 1968, Linear Algebra
and its Applications 1, 73). Taking something off is the same with D below zero. A band is clear of
every mode exactly when the counts at its two edges are equal.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.excitation import Band
from fieldkit.detune.field import Field
from fieldkit.detune.push import Push, removals
from fieldkit.detune.scatter import Scatter, as_installed

Array = NDArray[np.float64]
Count = NDArray[np.int64]

__all__ = ["Counter", "Scatter", "as_installed", "counter", "left_in", "merged", "negative_count"]

LEAST_EDGE_RAD_PER_S = 1e-2
DECOUPLED = 1e-7
"""Receptance between rows below this share of their own is rounding."""


def merged(bands: Sequence[Band], up_to_hz: float) -> list[tuple[float, float]]:
    """Forbidden intervals below the limit, overlapping ones joined, rising."""
    joined: list[tuple[float, float]] = []
    for band in sorted(bands, key=lambda b: b.avoid_low_hz):
        low, high = max(band.avoid_low_hz, 0.0), min(band.avoid_high_hz, up_to_hz)
        if low >= up_to_hz:
            continue
        if joined and low <= joined[-1][1]:
            joined[-1] = (joined[-1][0], max(joined[-1][1], high))
        else:
            joined.append((low, high))
    return joined


def left_in(count: Count) -> Count:
    """(..., intervals) modes left in each interval from the counts (..., edges) at its edges."""
    return np.asarray(count[..., 1::2] - count[..., 0::2])


@dataclass(frozen=True)
class Counter:
    """Counts of modes at the edges of the forbidden intervals, for one base field."""

    field: Field
    edge_rad_per_s: Array
    """(2 intervals,) low, high, low, high..."""
    base: Count
    """(members, edges) modes below each edge."""

    def receptance(self, shape: Array, residual: Array) -> Array:
        """(..., members, edges, p, p) motion per force at rows of motion.

        ``shape`` (..., members, p, r) is the motion of the base modes there, ``residual``
        (..., p, p) the static flexibility beside them.
        """
        return np.asarray(self._dynamic(shape) + residual[..., None, None, :, :])

    def equal_rows(self, shape: Array, residual: Array) -> Array:
        """(..., members, edges, p) principal receptances: all that counts where every row is held
        alike or carries the same mass."""
        p = shape.shape[-2]
        if p == 1:
            return self.receptance(shape, residual)[..., 0]
        return principal(self.receptance(shape, residual))

    def with_springs(self, principal_receptance: Array, stiffness: Array) -> Count:
        """(..., members, edges) counts after the same spring (..., members) at every row."""
        drop = (stiffness[..., None, None] * -principal_receptance > 1).sum(axis=-1)
        return np.asarray(self.base - drop)

    def with_masses(self, principal_receptance: Array, mass: Array) -> Count:
        """(..., members, edges) counts after the same mass (..., members) at every row."""
        inertia = mass[..., None, None] * (self.edge_rad_per_s**2)[:, None]
        return np.asarray(self.base + (inertia * principal_receptance > 1).sum(axis=-1))

    def with_push(self, push: Push) -> Count:
        """(members, edges) counts after any change of supports and masses."""
        push = removals(self.field, push)
        if not push.rows.shape[1]:
            return self.base
        receptance = self.receptance(push.rows @ self.field.modes.vector, push.residual)
        return self.with_update(receptance, self.softness(push))

    def softness(self, push: Push) -> Array:
        """(members, edges, p) 1/D of every row at every edge."""
        dynamic = push.stiffness[:, None] - self.edge_rad_per_s[:, None] ** 2 * push.mass[:, None]
        return np.asarray(1 / dynamic)

    def with_update(self, receptance: Array, softness: Array) -> Count:
        """(..., members, edges) counts from receptance (..., p, p) and 1/D (..., p)."""
        positive = receptance.shape[-1] - negative_count(receptance + _diagonal(softness))
        return np.asarray(self.base + positive - (softness > 0).sum(axis=-1))

    def some(self, members: NDArray[np.intp]) -> Counter:
        """The same for some of the members only."""
        return Counter(self.field.some(members), self.edge_rad_per_s, self.base[members])

    def clear_now(self) -> NDArray[np.bool_]:
        """(members,) whether every interval is empty without any fix."""
        return clear(self.base)

    def _dynamic(self, shape: Array) -> Array:
        """(..., members, edges, p, p): sum over modes of shape times shape over the gap."""
        gap = self.field.modes.eigenvalue[:, None, :] - self.edge_rad_per_s[None, :, None] ** 2
        weight = 1 / gap
        rows = np.moveaxis(shape, -3, 0)
        p = shape.shape[-2]
        found = np.empty((*shape.shape[:-2], len(self.edge_rad_per_s), p, p))
        for i in range(p):
            for j in range(i + 1):
                product = rows[..., i, :] * rows[..., j, :]
                flat = product.reshape(len(product), -1, product.shape[-1])
                summed = (flat @ np.swapaxes(weight, 1, 2)).reshape(*product.shape[:-1], -1)
                found[..., i, j] = found[..., j, i] = np.moveaxis(summed, 0, -2)
        return found


def counter(base: Field, bands: Sequence[Band], up_to_hz: float) -> Counter:
    """Count the modes of every member below each edge of the forbidden intervals."""
    intervals = merged(bands, up_to_hz)
    edges = 2 * np.pi * np.array([edge for interval in intervals for edge in interval])
    edges = np.maximum(edges, LEAST_EDGE_RAD_PER_S)
    below = base.modes.eigenvalue[:, None, :] < edges[None, :, None] ** 2
    return Counter(base, edges, below.sum(axis=2))


def clear(count: Count) -> NDArray[np.bool_]:
    """(...,) whether every interval is empty, from counts (..., edges)."""
    return np.asarray(np.all(left_in(count) == 0, axis=-1))


def principal(matrix: Array) -> Array:
    """(..., p) eigenvalues of small symmetric matrices (..., p, p), in any order."""
    diagonal = np.diagonal(matrix, axis1=-2, axis2=-1)
    p = matrix.shape[-1]
    own = np.sqrt(np.abs(diagonal))
    coupled = np.abs(matrix) > DECOUPLED * own[..., :, None] * own[..., None, :]
    if not np.any(coupled & ~np.eye(p, dtype=bool)):
        return np.asarray(diagonal)
    if p == 2:
        a, b, c = matrix[..., 0, 0], matrix[..., 1, 1], matrix[..., 0, 1]
        middle, half = 0.5 * (a + b), np.hypot(0.5 * (a - b), c)
        return np.stack([middle - half, middle + half], axis=-1)
    return np.asarray(np.linalg.eigvalsh(matrix))


def negative_count(matrix: Array) -> Count:
    """Negative eigenvalues of symmetric matrices (..., p, p) by the signs of LDL^T pivots."""
    size = matrix.shape[-1]
    rows = np.moveaxis(matrix, (-2, -1), (0, 1)).copy()
    negative = np.zeros(matrix.shape[:-2], dtype=np.int64)
    for i in range(size):
        pivot = np.where(rows[i, i] == 0.0, np.finfo(float).tiny, rows[i, i])
        negative += pivot < 0
        for j in range(i + 1, size):
            share = rows[j, i] / pivot
            rows[j, i + 1 : j + 1] -= share * rows[i + 1 : j + 1, i]
    return negative


def _diagonal(values: Array) -> Array:
    """(..., p) -> (..., p, p)."""
    return np.asarray(values[..., None] * np.eye(values.shape[-1]))
