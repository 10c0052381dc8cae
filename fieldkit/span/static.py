"""Static answers of a span: sag and support loads under weight, movement under heat.

Linear, every unknown stiffness at its median; supports push and pull alike.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.span import axial
from fieldkit.span.factor import Factor, rounding_floor
from fieldkit.span.layout import Span, State, Support
from fieldkit.span.restraint import span_matrices
from fieldkit.span.structure import Structure, assemble
from fieldkit.span.supports import springs

Array = NDArray[np.float64]

GRAVITY_M_PER_S2 = 9.80665
MESH_HZ = 50.0
"""The mesh that is good for modes up to this frequency is more than fine enough at rest."""


@dataclass(frozen=True)
class WeightAnswer:
    """What gravity does to a span."""

    sag_m: float
    """Largest movement down."""
    sag_at_m: float
    """Where."""
    support_loads: tuple[tuple[int, Array], ...]
    """(index of the support, force (3,) in newtons on the pipe, x y z), in order of support."""


def weight_answer(span: Span, state: State) -> WeightAnswer:
    """Sag and support loads under pipe, contents, insulation and point masses."""
    structure = assemble(span, state, up_to_hz=MESH_HZ, axial=False)
    stiffness, mass = span_matrices(structure, springs(span), span.masses)
    down = np.zeros((len(structure.station_m), 6))
    down[:, 2] = -GRAVITY_M_PER_S2
    moved = _at_rest(stiffness, mass, mass @ down.ravel())
    drop = -moved.reshape(-1, 6)[:, 2]
    lowest = int(np.argmax(drop))
    loads = tuple((i, _support_force(structure, i, moved)) for i in range(len(span.supports)))
    return WeightAnswer(max(float(drop[lowest]), 0.0), float(structure.station_m[lowest]), loads)


def thermal_movement(span: Span, cold: State, hot: State, at_m: float) -> Array:
    """Movement (3,) in metres of a station from one state to the other, x y z.

    Heat and pressure against the supports there are; weight is the same in both and left out.
    """
    return _grown(span, hot, at_m) - _grown(span, cold, at_m)


def restraint_force(
    span: Span, cold: State, hot: State, at_m: float, axis: str, stiffness_n_per_m: float
) -> float:
    """Force in newtons that a new spring along ``axis`` holds back between the states."""
    held = Support(at_m, "free", **{axis: stiffness_n_per_m})
    with_spring = replace(span, supports=(*span.supports, held))
    structure = assemble(with_spring, hot, up_to_hz=MESH_HZ, axial=False)
    rows = structure.motion_rows(at_m, axis)
    hot_growth = axial.growth(structure)
    cold_growth = axial.growth(assemble(with_spring, cold, up_to_hz=MESH_HZ, axial=False))
    return float(stiffness_n_per_m * np.linalg.norm(rows @ (hot_growth - cold_growth)))


def _grown(span: Span, state: State, at_m: float) -> Array:
    structure = assemble(span, state, up_to_hz=MESH_HZ, axial=False)
    rows = structure.point_rows(at_m, (0.0, 0.0, 0.0))
    return np.asarray(rows @ axial.growth(structure))


def _at_rest(stiffness: object, mass: object, force: Array) -> Array:
    """Displacement (6N,) under a load; a free direction moves until rounding holds it."""
    floor = rounding_floor(stiffness, mass)  # type: ignore[arg-type]
    return Factor(stiffness + floor * mass).solve(force)  # type: ignore[operator]


def _support_force(structure: Structure, index: int, moved: Array) -> Array:
    """Force (3,) that a support puts on the pipe."""
    force = np.zeros(3)
    for spring in springs(structure.span):
        if spring.support != index or spring.axis in ("rotation", "torsion"):
            continue
        rows = structure.motion_rows(spring.at_m, spring.axis)
        translation = structure.point_rows(spring.at_m, (0.0, 0.0, 0.0))
        vectors = rows @ np.linalg.pinv(translation)
        force -= spring.stiffness * vectors.T @ (rows @ moved)
    return force
