"""Small plane frames, many at once: how far a node gives under a force.

Direct stiffness method (Przemieniecki 1968, Theory of Matrix Structural Analysis, ch. 5, from
memory); members bend, shear and stretch, bases are springs.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Member:
    """A straight member between two nodes, for all frames of a batch."""

    start: int
    end: int
    axial_n: Array
    """(B,) E A."""
    bending_n_m2: Array
    """(B,) E I; 0 for a bar with pinned ends."""
    shear_n: Array
    """(B,) G A_s."""


@dataclass(frozen=True)
class Base:
    """A node on springs along x and y (B,) N/m and against turning (B,) N m/rad."""

    node: int
    translation_n_per_m: Array
    rotation_n_m_per_rad: Array


def compliance(
    nodes: Array, members: tuple[Member, ...], bases: tuple[Base, ...], node: int
) -> Array:
    """(B, 2) metres a newton of a node along x and y; ``nodes`` is (B, N, 2) metres."""
    batch, count = nodes.shape[:2]
    whole = np.zeros((batch, 3 * count, 3 * count))
    for member in members:
        dofs = [3 * member.start + i for i in range(3)] + [3 * member.end + i for i in range(3)]
        whole[:, np.array(dofs)[:, None], np.array(dofs)] += _stiffness(nodes, member)
    for base in bases:
        first = 3 * base.node
        whole[:, first, first] += base.translation_n_per_m
        whole[:, first + 1, first + 1] += base.translation_n_per_m
        whole[:, first + 2, first + 2] += base.rotation_n_m_per_rad
    loads = np.zeros((3 * count, 2))
    loads[3 * node, 0] = loads[3 * node + 1, 1] = 1.0
    moved = np.linalg.solve(whole, np.broadcast_to(loads, (batch, *loads.shape)))
    return np.stack([moved[:, 3 * node, 0], moved[:, 3 * node + 1, 1]], axis=1)


def _stiffness(nodes: Array, member: Member) -> Array:
    """(B, 6, 6) in frame axes."""
    along = nodes[:, member.end] - nodes[:, member.start]
    length = np.linalg.norm(along, axis=1)
    c, s = (along / length[:, None]).T
    local = np.zeros((len(length), 6, 6))
    stretch = member.axial_n / length
    local[:, 0, 0] = local[:, 3, 3] = stretch
    local[:, 0, 3] = local[:, 3, 0] = -stretch
    shear = 12 * member.bending_n_m2 / (member.shear_n * length**2)
    beam = member.bending_n_m2 / (length**3 * (1 + shear))
    own, other = (4 + shear) * length**2 * beam, (2 - shear) * length**2 * beam
    local[:, 1, 1] = local[:, 4, 4] = 12 * beam
    local[:, 1, 4] = local[:, 4, 1] = -12 * beam
    for i, j, sign in ((1, 2, 1), (1, 5, 1), (4, 2, -1), (4, 5, -1)):
        local[:, i, j] = local[:, j, i] = sign * 6 * beam * length
    local[:, 2, 2] = local[:, 5, 5] = own
    local[:, 2, 5] = local[:, 5, 2] = other
    turn = np.zeros((len(length), 6, 6))
    for i in (0, 3):
        turn[:, i, i] = turn[:, i + 1, i + 1] = c
        turn[:, i, i + 1], turn[:, i + 1, i] = s, -s
        turn[:, i + 2, i + 2] = 1.0
    return np.asarray(np.swapaxes(turn, 1, 2) @ local @ turn)
