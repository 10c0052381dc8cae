"""Static answers of a span: sag and support loads under weight, movement under heat.

Linear, every unknown stiffness at its median; supports push and pull alike.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import Refusal
from fieldkit.span import axial
from fieldkit.span import elements as element
from fieldkit.span.factor import Factor, rounding_floor
from fieldkit.span.layout import Span, State, axis_vectors
from fieldkit.span.restraint import span_matrices
from fieldkit.span.structure import Structure, assemble
from fieldkit.span.supports import springs

if TYPE_CHECKING:
    from scipy.sparse import csc_array

Array = NDArray[np.float64]

GRAVITY_M_PER_S2 = 9.80665
MESH_HZ = 50.0
"""The mesh that is good for modes up to this frequency is more than fine enough at rest."""
FALLEN_SHARE = 0.2
FALLEN_RAD = 1.0
"""Movement and turning under weight that no standing pipe shows."""


@dataclass(frozen=True)
class WeightAnswer:
    """What gravity does to a span."""

    sag_m: float
    """Largest movement down."""
    sag_at_m: float
    """Where."""
    support_loads: tuple[tuple[int, Array], ...]
    """(index of the support, force (3,) in newtons on the pipe, x y z), in order of support."""
    bending_stress_pa: float
    """Largest, of the nominal section: nothing added for bends, branches or pressure."""
    stressed_at_m: float
    """Where."""


def weight_answer(span: Span, state: State) -> WeightAnswer:
    """Sag and support loads under pipe, contents, insulation and point masses.

    Refusal where nothing holds the span up, or keeps an offset mass from turning the pipe over.
    """
    structure = assemble(span, state, up_to_hz=MESH_HZ, axial=False)
    stiffness, mass = span_matrices(structure, springs(span), span.masses)
    moved = solver_of(stiffness, mass).solve(weight_load(mass))
    _refuse_falling(span, moved)
    drop = -moved.reshape(-1, 6)[:, 2]
    lowest = int(np.argmax(drop))
    loads = tuple((i, _support_force(structure, i, moved)) for i in range(len(span.supports)))
    stress_pa, stressed_at_m = bending_stress(structure, moved)
    return WeightAnswer(
        sag_m=max(float(drop[lowest]), 0.0),
        sag_at_m=float(structure.station_m[lowest]),
        support_loads=loads,
        bending_stress_pa=stress_pa,
        stressed_at_m=stressed_at_m,
    )


def bending_stress(structure: Structure, moved: Array) -> tuple[float, float]:
    """Largest bending stress in pascals and its station, under weight that moves the nodes (6N,).

    M D / (2 I) with the moment at the ends and the middle of every element; between point loads the
    moment is a parabola.
    """
    elements, count = structure.elements, len(structure.element_length_m)
    down = np.zeros((count, 12))
    down[:, [2, 8]] = -GRAVITY_M_PER_S2
    weight = np.einsum("eij,ej->ei", element.mass(elements), down)
    nodal = moved.reshape(-1, 6)
    ends = np.concatenate([nodal[:-1], nodal[1:]], axis=1)
    force = np.einsum("eij,ej->ei", element.stiffness(elements), ends) - weight
    along = np.diff(structure.position_m, axis=0)
    total = weight[:, 0:3] + weight[:, 6:9]
    middle = force[:, 3:6] - np.cross(along / 2, force[:, 0:3]) - np.cross(along / 8, total)
    moment = np.stack([force[:, 3:6], middle, force[:, 9:12]], axis=1)
    direction = along / np.linalg.norm(along, axis=1, keepdims=True)
    twist = np.sum(moment * direction[:, None], axis=2, keepdims=True) * direction[:, None]
    bending = np.linalg.norm(moment - twist, axis=2)
    worst, place = np.unravel_index(int(np.argmax(bending)), bending.shape)
    pipe = structure.span.pipe
    stress = bending[worst, place] * pipe.outside_diameter_m / (2 * pipe.second_moment_m4)
    start, end = structure.station_m[worst : worst + 2]
    return float(stress), float(start + 0.5 * place * (end - start))


@dataclass(frozen=True)
class ThermalGrowth:
    """How a span moves from one state to another by heat and pressure, its supports holding."""

    cold: Structure
    cold_moved: Array
    hot: Structure
    hot_moved: Array

    def at(self, at_m: float) -> Array:
        """Movement (3,) in metres of a station, x y z."""
        hot = self.hot.point_rows(at_m, (0.0, 0.0, 0.0)) @ self.hot_moved
        cold = self.cold.point_rows(at_m, (0.0, 0.0, 0.0)) @ self.cold_moved
        return np.asarray(hot - cold)


def thermal_growth(span: Span, cold: State, hot: State) -> ThermalGrowth:
    """Movement of every station; weight is the same in both states and left out."""
    before = assemble(span, cold, up_to_hz=MESH_HZ, axial=False)
    after = assemble(span, hot, up_to_hz=MESH_HZ, axial=False)
    return ThermalGrowth(before, axial.growth(before), after, axial.growth(after))


def thermal_movement(span: Span, cold: State, hot: State, at_m: float) -> Array:
    """Movement (3,) in metres of one station from one state to the other, x y z."""
    return thermal_growth(span, cold, hot).at(at_m)


def weight_load(mass: csc_array) -> Array:
    """Nodal loads (6N,) of gravity on a mass matrix."""
    down = np.zeros((mass.shape[0] // 6, 6))
    down[:, 2] = -GRAVITY_M_PER_S2
    load: Array = mass @ down.ravel()
    return load


def solver_of(stiffness: csc_array, mass: csc_array) -> Factor:
    """A free direction moves until rounding holds it."""
    return Factor((stiffness + rounding_floor(stiffness, mass) * mass).tocsc())


def _refuse_falling(span: Span, moved: Array) -> None:
    nodal = np.abs(moved.reshape(-1, 6))
    if nodal[:, 2].max() > FALLEN_SHARE * span.length_m:
        raise Refusal("the supports do not hold the span up", "add what carries its weight")
    if nodal[:, 3:].max() > FALLEN_RAD:
        raise Refusal(
            "no support keeps the span from turning over under its weight",
            "add a support that grips it (clamp, anchor), or correct the offset of the mass",
        )


def _support_force(structure: Structure, index: int, moved: Array) -> Array:
    """Force (3,) that a support puts on the pipe."""
    force = np.zeros(3)
    for spring in springs(structure.span):
        if spring.support == index and spring.axis not in ("rotation", "torsion"):
            rows = structure.motion_rows(spring.at_m, spring.axis)
            vectors = axis_vectors(structure.span.centre_line.at(spring.at_m)[1], spring.axis)
            force -= spring.stiffness * vectors.T @ (rows @ moved)
    return force
