"""Frequencies after a change from about ten modes of the base and the deflections it calls for.

The modes that are left out act through the shapes they give under a unit force at each changed row
(attachment vectors: Craig 1981, Structural Dynamics, from memory), so that what remains is a Ritz
problem of the kept modes and one vector per row.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.reduced import Modes, solve_many

Array = NDArray[np.float64]

KEPT_MODES = 10
KEPT_RANGE = 2.0
"""Modes up to this many times the highest frequency asked for are kept, if they are more."""
SOFT_SHARE, STIFFEST_M_PER_N = 1e-6, 1e-13
"""A mass is taken as fixed to its place where the flexibility between them is less."""
FLOOR = 1e-3
"""Eigenvalues of left-out modes are far above this; it only guards a free one, rad^2/s^2."""


@dataclass(frozen=True)
class Condensed:
    """A base field seen from p rows: kept modes and one attachment vector per row."""

    stiffness: Array
    """(members, q, q) q = kept + p."""
    motion: Array
    """(members, p, q) of the rows."""
    vector: Array
    """(members, r, q) in the coordinates of the basis."""
    residual: Array
    """(p, p)."""

    def modes(self, spring: Array, mass: Array) -> Modes:
        """Modes after springs and masses (members, p) at the rows."""
        stiffness = self._with_springs(spring)
        heavy = np.flatnonzero(mass.any(axis=0))
        if not len(heavy):
            eigenvalue, vector = np.linalg.eigh(stiffness)
            return Modes(eigenvalue, self.vector @ vector)
        softness, ways = _principal_flexibility(self.residual[np.ix_(heavy, heavy)])
        q, more = stiffness.shape[-1], len(softness)
        own = np.broadcast_to(ways, (len(stiffness), *ways.shape))
        motion = np.concatenate([self.motion[:, heavy], own], axis=2)
        whole = np.zeros((len(stiffness), q + more, q + more))
        whole[:, :q, :q] = stiffness
        whole[:, range(q, q + more), range(q, q + more)] = 1 / softness
        inertia = np.swapaxes(motion, 1, 2) @ (mass[:, heavy, None] * motion)
        inertia[:, range(q), range(q)] += 1.0
        found = solve_many(whole, inertia)
        return Modes(found.eigenvalue, self.vector @ found.vector[:, :q])

    def eigenvalues(self, spring: Array) -> Array:
        """(..., members, q) after springs (..., members, p), for many sizes at once."""
        return np.asarray(np.linalg.eigvalsh(self._with_springs(spring)))

    def _with_springs(self, spring: Array) -> Array:
        held = np.flatnonzero(np.any(spring.reshape(-1, spring.shape[-1]) > 0, axis=0))
        if not len(held):
            return self.stiffness
        motion = self.motion[..., held, :]
        own = (1 / spring[..., held])[..., None] * np.eye(len(held))
        series = own + self.residual[np.ix_(held, held)]
        inverse = 1 / series if len(held) == 1 else np.linalg.inv(series)
        return np.asarray(self.stiffness + np.swapaxes(motion, -1, -2) @ (inverse @ motion))


def _principal_flexibility(residual: Array) -> tuple[Array, Array]:
    """(k,) flexibilities worth keeping and the rows' share (p, k) in each: a mass rides on them."""
    softness, ways = np.linalg.eigh(residual)
    kept = softness > max(SOFT_SHARE * softness.max(), STIFFEST_M_PER_N)
    return softness[kept], ways[:, kept]


def kept_modes(base: Modes, up_to_hz: float) -> int:
    """How many modes to keep for answers up to a frequency."""
    within = (base.frequency_hz < KEPT_RANGE * up_to_hz).sum(axis=1)
    return int(min(base.eigenvalue.shape[1], max(KEPT_MODES, int(np.median(within)))))


def condensed(base: Modes, rows: Array, residual: Array, kept: int) -> Condensed:
    """The base seen from rows of motion (members, p, r) in the coordinates of the basis."""
    shape = rows @ base.vector
    members, p, r = shape.shape
    if r - kept <= p:
        kept = r
    low, high = shape[:, :, :kept], shape[:, :, kept:]
    stiffness = base.eigenvalue[:, :kept, None] * np.eye(kept)
    if kept == r:
        return Condensed(stiffness, low, base.vector, residual)
    above = np.maximum(base.eigenvalue[:, kept:, None], FLOOR)
    attached, _ = np.linalg.qr(np.swapaxes(high, 1, 2) / above)
    whole = np.zeros((members, kept + p, kept + p))
    whole[:, :kept, :kept] = stiffness
    whole[:, kept:, kept:] = np.swapaxes(attached, 1, 2) @ (above * attached)
    motion = np.concatenate([low, high @ attached], axis=2)
    vector = np.concatenate([base.vector[:, :, :kept], base.vector[:, :, kept:] @ attached], axis=2)
    return Condensed(whole, motion, vector, residual)
