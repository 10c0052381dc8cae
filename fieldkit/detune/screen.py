"""Whether a fix clears the bands: counted at the band edges, nothing solved.

The number of natural frequencies below w after adding springs D at ports with receptance G(w) is
N - neg(D^-1 + G), and after adding masses (D = -w^2 m) N + pos(D^-1 + G): the law of inertia
applied to the bordered matrix (Haynsworth 1968, Linear Algebra and its Applications 1, 73). A band
is clear of every mode exactly when the counts at its two edges are equal.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.excitation import Band
from fieldkit.detune.field import Field

Array = NDArray[np.float64]

STIFFNESS_SCATTER_LN = 0.35
"""A bracket comes out this much stiffer or softer than drawn (common practice, no source)."""
PLACE_SCATTER_M = 0.015


@dataclass(frozen=True)
class Scatter:
    """How one member's bracket differs from the drawing."""

    stiffness_factor: Array
    """(members,)"""
    place_m: Array
    """(members,)"""


def as_installed(members: int, rng: np.random.Generator) -> Scatter:
    """Draw the scatter of installation once for all candidates, so that they compare fairly."""
    return Scatter(
        np.exp(STIFFNESS_SCATTER_LN * rng.standard_normal(members)),
        PLACE_SCATTER_M * rng.standard_normal(members),
    )


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


@dataclass(frozen=True)
class Counter:
    """Counts of modes at the edges of the forbidden intervals, for one base field."""

    field: Field
    edge_rad_per_s: Array
    """(2 intervals,) low, high, low, high..."""
    base: NDArray[np.int64]
    """(members, edges) modes below each edge."""

    def receptance(self, shape: Array, residual: Array) -> Array:
        """(members, edges, p, p) motion per force; ``shape`` (members, p, r) is of the ports."""
        gap = self.field.modes.eigenvalue[:, None, :] - self.edge_rad_per_s[None, :, None] ** 2
        weighted = shape[:, None] / gap[:, :, None, :]
        dynamic = weighted @ np.swapaxes(shape, 1, 2)[:, None]
        return np.asarray(dynamic + residual)

    def clear_with_springs(self, receptance: Array, stiffness: Array) -> NDArray[np.bool_]:
        """Whether every interval is empty after adding springs.

        ``receptance`` is (members, edges, p, p), ``stiffness`` (levels, members, p);
        the answer is (levels, members).
        """
        bordered = receptance[None] + _diagonal(1 / stiffness)[:, :, None]
        return self._clear(self.base - negative_count(bordered))

    def clear_with_masses(self, receptance: Array, mass: Array) -> NDArray[np.bool_]:
        """The same for added masses (levels, members, p)."""
        inertia = mass[:, :, None, :] * self.edge_rad_per_s[None, None, :, None] ** 2
        bordered = receptance[None] - _diagonal(1 / inertia)
        ports = receptance.shape[-1]
        return self._clear(self.base + ports - negative_count(bordered))

    def clear_now(self) -> NDArray[np.bool_]:
        """(members,) whether every interval is empty without any fix."""
        return self._clear(self.base)

    def _clear(self, count: NDArray[np.int64]) -> NDArray[np.bool_]:
        return np.asarray(np.all(count[..., 1::2] == count[..., 0::2], axis=-1))


def counter(base: Field, bands: Sequence[Band], up_to_hz: float) -> Counter:
    """Count the modes of every member below each edge of the forbidden intervals."""
    intervals = merged(bands, up_to_hz)
    edges = 2 * np.pi * np.array([edge for interval in intervals for edge in interval])
    below = base.modes.eigenvalue[:, None, :] < edges[None, :, None] ** 2
    return Counter(base, edges, below.sum(axis=2))


def negative_count(matrix: Array) -> NDArray[np.int64]:
    """Negative eigenvalues of symmetric matrices (..., p, p) by the signs of LDL^T pivots."""
    work = matrix.copy()
    size = work.shape[-1]
    negative = np.zeros(work.shape[:-2], dtype=np.int64)
    for i in range(size):
        pivot = work[..., i, i]
        pivot = np.where(pivot == 0.0, np.finfo(float).tiny, pivot)
        negative += pivot < 0
        if i + 1 < size:
            column = work[..., i + 1 :, i]
            row = column / pivot[..., None]
            work[..., i + 1 :, i + 1 :] -= column[..., :, None] * row[..., None, :]
    return negative


def _diagonal(values: Array) -> Array:
    """(..., p) -> (..., p, p)."""
    return np.asarray(values[..., None] * np.eye(values.shape[-1]))
