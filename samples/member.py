"""A short straight piece of pipe: its section, its stiffness and its lumped mass.

Stiffness comes from the flexibility of a cantilever with bending, shear, twist and stretch, exact
for loads at its ends. In an elbow the bending stiffness is divided by the flexibility factor of
ASME B31.3, Appendix D.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Block = tuple[tuple[int, ...], Array]
"""A matrix and the nodes it belongs to."""


@dataclass(frozen=True)
class Tube:
    """Wall of the pipe and what rides on it; SI units."""

    outside_m: float
    wall_m: float
    modulus_pa: float
    density: float = 7850.0
    poisson: float = 0.3
    content_density: float = 0.0
    """Of the bore as it is filled: density times filled fraction."""
    cover_kg_per_m: float = 0.0
    """Insulation."""
    pressure_pa: float = 0.0
    heated_strain: float = 0.0
    """Free growth per length since it was built: expansion coefficient times temperature rise."""

    @property
    def bore_m(self) -> float:
        """Inside diameter."""
        return self.outside_m - 2 * self.wall_m

    @property
    def area(self) -> float:
        """Of the metal."""
        return math.pi / 4 * (self.outside_m**2 - self.bore_m**2)

    @property
    def bore_area(self) -> float:
        """Of the contents."""
        return math.pi / 4 * self.bore_m**2

    @property
    def second_moment(self) -> float:
        """About a diameter."""
        return math.pi / 64 * (self.outside_m**4 - self.bore_m**4)

    @property
    def kg_per_m(self) -> float:
        """Metal, contents and insulation."""
        return (
            self.density * self.area + self.content_density * self.bore_area + self.cover_kg_per_m
        )

    @property
    def shear_coefficient(self) -> float:
        """Cowper 1966, J. Appl. Mech. 33, 335: hollow circle."""
        nu, ratio = self.poisson, self.bore_m / self.outside_m
        full = (7 + 6 * nu) * (1 + ratio**2) ** 2 + (20 + 12 * nu) * ratio**2
        return 6 * (1 + nu) * (1 + ratio**2) ** 2 / full

    def elbow_flexibility(self, radius_m: float) -> float:
        """Flexibility factor of ASME B31.3, Appendix D, with its pressure correction."""
        r = (self.outside_m - self.wall_m) / 2
        k = 1.65 * r**2 / (self.wall_m * radius_m)
        ratio = self.pressure_pa / self.modulus_pa
        stiffening = 1 + 6 * ratio * (r / self.wall_m) ** (7 / 3) * (radius_m / r) ** (1 / 3)
        return float(max(1.0, k / stiffening))


@dataclass(frozen=True)
class Member:
    """A short straight member between two nodes."""

    nodes: tuple[int, int]
    ends: tuple[Array, Array]
    length: float
    tube: Tube
    flexibility: float

    @property
    def axes(self) -> Array:
        """(3, 3) rows: along, and two across."""
        along = self.ends[1] - self.ends[0]
        along = along / np.linalg.norm(along)
        across = np.cross(along, np.eye(3)[np.argmin(np.abs(along))])
        across = across / np.linalg.norm(across)
        return np.array([along, across, np.cross(along, across)])

    def stiffness(self) -> Array:
        """(12, 12) from the flexibility of a cantilever: exact for loads at the nodes."""
        t, h = self.tube, self.length
        shear_modulus = t.modulus_pa / (2 * (1 + t.poisson))
        bending = t.modulus_pa * t.second_moment / self.flexibility
        sway = h**3 / (3 * bending) + h / (t.shear_coefficient * shear_modulus * t.area)
        mixed, turn = h**2 / (2 * bending), h / bending
        flexibility = np.zeros((6, 6))
        flexibility[0, 0] = h / (t.modulus_pa * t.area)
        flexibility[3, 3] = h / (shear_modulus * 2 * t.second_moment)
        flexibility[np.ix_((1, 5), (1, 5))] = [[sway, mixed], [mixed, turn]]
        flexibility[np.ix_((2, 4), (2, 4))] = [[sway, -mixed], [-mixed, turn]]
        balance = np.hstack([-_carry(h).T, np.eye(6)])
        local = balance.T @ np.linalg.inv(flexibility) @ balance
        return self._to_global(local)

    def stiffness_of_pull(self, tension_n: float) -> Array:
        """(12, 12) of a taut string: what an axial force adds across the member."""
        local = np.zeros((12, 12))
        for axis in (1, 2):
            pair = np.ix_((axis, axis + 6), (axis, axis + 6))
            local[pair] = tension_n / self.length * np.array([[1, -1], [-1, 1]])
        return self._to_global(local)

    def lumped_mass(self) -> list[Block]:
        """Half of the member at either node, with the rotary inertia of the metal."""
        t, h = self.tube, self.length
        turning = t.density * t.second_moment * h / 2
        spin = np.eye(3) + np.outer(self.axes[0], self.axes[0])
        block = np.zeros((6, 6))
        block[:3, :3] = t.kg_per_m * h / 2 * np.eye(3)
        block[3:, 3:] = turning * spin
        return [((node,), block) for node in self.nodes]

    def heat_force(self) -> tuple[Array, float]:
        """(12,) forces by which hindered growth pushes its nodes, and the force if held fast."""
        held = -self.tube.modulus_pa * self.tube.area * self.tube.heated_strain
        held -= (1 - 2 * self.tube.poisson) * self.tube.pressure_pa * self.tube.bore_area
        push = np.zeros(12)
        push[:3], push[6:9] = held * self.axes[0], -held * self.axes[0]
        return push, held

    def stretch(self, movement: Array) -> float:
        """How much longer it is when its nodes move by (12,)."""
        return float(self.axes[0] @ (movement[6:9] - movement[:3]))

    def _to_global(self, local: Array) -> Array:
        turn = np.kron(np.eye(4), self.axes)
        return turn.T @ local @ turn


def _carry(h: float) -> Array:
    """(6, 6) load at the near end that balances a load at the far end, h along the member."""
    carry = np.eye(6)
    carry[5, 1], carry[4, 2] = h, -h
    return carry
