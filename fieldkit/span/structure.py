"""The bare pipe of a span in a state, assembled: mass and stiffness, and how to read them.

Supports and point masses are left out, because each is a change of low rank: a spring adds
k b^T b with b from ``motion_rows``, a point mass m J^T J with J from ``point_rows``. The contents
move with the pipe in all three directions and do not turn with it (usual in piping models).

Nothing but a support holds a straight pipe against turning about its own axis. Such a twist is a
mode like any other to an eigensolver; ``modes.direction_shares`` tells it apart.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from fieldkit.span import axial as axial_forces
from fieldkit.span import elements as element
from fieldkit.span.elements import ElementSet
from fieldkit.span.layout import Span, State, axis_vectors
from fieldkit.span.line import flexibility_of, line_of
from fieldkit.span.mesh import Mesh, lay_mesh

if TYPE_CHECKING:
    from scipy.sparse import csc_array

Array = NDArray[np.float64]

_WALL_STEP = 1e-4
_LENGTH_STEP = 1e-4


@dataclass(frozen=True)
class Structure:
    """The bare pipe of a span in a state: pipe, contents, insulation; no supports, no point masses.

    N nodes in order of station, E = N - 1 elements between them; six degrees of freedom a node,
    ux uy uz rx ry rz in global axes.
    """

    span: Span
    state: State
    fill: float
    """Filled fraction of the bore that ``mass`` holds."""
    station_m: Array
    """(N,)"""
    position_m: Array
    """(N, 3)"""
    tangent: Array
    """(N, 3) unit vectors along the centre line."""
    element_length_m: Array
    """(E,) along the true centre line."""
    element_station_m: Array
    """(E,) middle stations."""
    axial_force_n: Array
    """(E,) effective axial force, tension positive, as ``stiffness`` holds it."""
    stiffness: csc_array
    """(6N, 6N), axial force included."""
    mass: csc_array
    """(6N, 6N)"""
    mesh: Mesh
    elements: ElementSet

    def motion_rows(self, at_m: float, axis: str) -> Array:
        """Rows b (k, 6N): b @ u is the motion of the centre line at a station along ``axis``.

        ``axis`` is any of ``layout.axis_vectors``; ``rotation`` and ``torsion`` give rotations.
        Inside an element the element's own shape functions are used.
        """
        translation, rotation = self.station_motion(at_m)
        tangent = self.span.centre_line.at(at_m)[1]
        vectors = axis_vectors(tangent, axis)
        return vectors @ (rotation if axis in ("rotation", "torsion") else translation)

    def point_rows(self, at_m: float, offset_m: tuple[float, float, float]) -> Array:
        """Rows J (3, 6N): translation of a point rigidly offset from the centre line."""
        translation, rotation = self.station_motion(at_m)
        carried: Array = translation - element.cross_matrix(np.array(offset_m)) @ rotation
        return carried

    def station_motion(self, at_m: float) -> tuple[Array, Array]:
        """Translation and rotation (3, 6N each) of the centre line at a station."""
        last = len(self.station_m) - 2
        index = int(np.clip(np.searchsorted(self.station_m, at_m) - 1, 0, last))
        start, end = self.station_m[index : index + 2]
        share = float(np.clip((at_m - start) / (end - start), 0.0, 1.0))
        translation, rotation = np.zeros((2, 3, 6 * len(self.station_m)))
        if share in (0.0, 1.0):
            first = 6 * (index + int(share))
            translation[:, first : first + 3] = rotation[:, first + 3 : first + 6] = np.eye(3)
            return translation, rotation
        columns = slice(6 * index, 6 * index + 12)
        translation[:, columns], rotation[:, columns] = self._inside(index, share, at_m)
        return translation, rotation

    def _inside(self, index: int, share: float, at_m: float) -> tuple[Array, Array]:
        """Motion (3, 12 each) of the true centre line beside a point of an element's own line."""
        translation, rotation = element.motion_inside(self.elements, index, share)
        start, end = self.position_m[index : index + 2]
        on_element = start + share * (end - start) + self.elements.offset_m[index]
        lever = self.span.centre_line.at(at_m)[0] - on_element
        return translation - element.cross_matrix(lever) @ rotation, rotation


def assemble(
    span: Span,
    state: State,
    *,
    up_to_hz: float,
    extra_stations_m: tuple[float, ...] = (),
    axial: bool = True,
    fill: float | None = None,
) -> Structure:
    """The structure of a span in a state, meshed for modes up to ``up_to_hz``.

    ``fill`` replaces the middle of the state's range. With ``axial`` the axial force of pressure
    and restrained heat is found with the supports at their medians and stiffens or softens the
    pipe; Refusal where the span buckles under it, or where it needs too many nodes.
    """
    radii = np.array([piece.radius_m for piece in span.centre_line.pieces])
    flexibility = flexibility_of(span, state, radii)
    mesh = lay_mesh(span, line_of(span, state), up_to_hz, tuple(extra_stations_m), flexibility)
    filled = state.nominal_fill if fill is None else fill
    elements = _elements(span, state, mesh, filled)
    no_force = np.zeros(len(mesh.chord_m))
    structure = Structure(
        span=span,
        state=state,
        fill=filled,
        station_m=mesh.station_m,
        position_m=mesh.position_m,
        tangent=mesh.tangent,
        element_length_m=mesh.arc_length_m,
        element_station_m=(mesh.station_m[:-1] + mesh.station_m[1:]) / 2,
        axial_force_n=no_force,
        stiffness=_joined(element.stiffness(elements)),
        mass=_joined(element.mass(elements)),
        mesh=mesh,
        elements=elements,
    )
    return _loaded(structure) if axial else structure


def _loaded(structure: Structure) -> Structure:
    force = axial_forces.effective_force(structure)
    if not np.any(force):
        return structure
    loaded = with_axial_force(structure, force)
    axial_forces.refuse_buckled(loaded)
    return loaded


def with_axial_force(structure: Structure, force_n: Array) -> Structure:
    """The structure under an axial force (E,) in place of the one it had."""
    matrices = _element_stiffness(structure.elements, force_n)
    return replace(structure, axial_force_n=force_n, stiffness=_joined(matrices))


def segments(span: Span) -> tuple[tuple[float, float], ...]:
    """Stretches (start_m, end_m) between consecutive ends, supports and corners, as measured."""
    corners = np.cumsum([0.0, *(leg.length_m for leg in span.legs)])
    marks = np.unique(
        np.concatenate([corners, [s.at_m for s in span.supports]]).clip(0, corners[-1])
    )
    kept = [float(marks[0])]
    kept += [float(b) for a, b in pairwise(marks) if b - a > 1e-6]
    return tuple(pairwise(kept))


def stretch_derivative(
    structure: Structure, start_m: float, end_m: float
) -> tuple[csc_array, csc_array]:
    """(dK, dM) by the relative length of the line between two stations, nodes staying in number.

    The straight pipe takes the whole change, as on site, where a bend is what it is; only a
    stretch that is all bend stretches in the bend. Axial force held.
    """
    share = _stretch_share(structure, start_m, end_m)
    up = structure.elements.stretched(1 + _LENGTH_STEP * share)
    down = structure.elements.stretched(1 - _LENGTH_STEP * share)
    return _difference(structure, up, down, 2 * _LENGTH_STEP)


def wall_derivative(structure: Structure) -> tuple[csc_array, csc_array]:
    """(dK, dM) by the relative wall thickness, outside diameter and axial force held."""
    up, down = (
        _elements(_thicker(structure.span, f), structure.state, structure.mesh, structure.fill)
        for f in (1 + _WALL_STEP, 1 - _WALL_STEP)
    )
    return _difference(structure, up, down, 2 * _WALL_STEP)


def contents_mass(structure: Structure) -> csc_array:
    """Mass matrix of the full contents: M = M_empty + fill * contents_mass."""
    full = line_of(structure.span, structure.state).contents_kg_per_m
    contents = replace(
        structure.elements,
        mass_kg_per_m=full * structure.mesh.arc_length_m / structure.mesh.chord_m,
        rotary_inertia_kg_m=np.zeros_like(structure.elements.rotary_inertia_kg_m),
    )
    return _joined(element.mass(contents))


def _element_stiffness(elements: ElementSet, force_n: Array) -> Array:
    elastic = element.stiffness(elements)
    if not np.any(force_n):
        return elastic
    return elastic + element.geometric_stiffness(elements, force_n)


def _difference(
    structure: Structure, up: ElementSet, down: ElementSet, step: float
) -> tuple[csc_array, csc_array]:
    force = structure.axial_force_n
    stiffness = (_element_stiffness(up, force) - _element_stiffness(down, force)) / step
    mass = (element.mass(up) - element.mass(down)) / step
    return _joined(stiffness), _joined(mass)


def _stretch_share(structure: Structure, start_m: float, end_m: float) -> Array:
    """Relative stretch (E,) of each element for a unit relative change between two stations."""
    station = structure.station_m
    overlap = np.clip(np.minimum(station[1:], end_m) - np.maximum(station[:-1], start_m), 0.0, None)
    straight = np.where(np.isinf(structure.mesh.bend_radius_m), overlap, 0.0)
    taken = straight if straight.sum() > 1e-9 else overlap
    share: Array = taken / np.diff(station) * (end_m - start_m) / taken.sum()
    return share


def _thicker(span: Span, factor: float) -> Span:
    return replace(span, pipe=replace(span.pipe, wall_m=span.pipe.wall_m * factor))


def _joined(matrices: Array) -> csc_array:
    """Element matrices (E, 12, 12) of the chain added into one (6N, 6N)."""
    from scipy.sparse import csc_array

    count = len(matrices)
    dofs = 6 * np.arange(count)[:, None] + np.arange(12)
    rows = np.repeat(dofs, 12, axis=1).ravel()
    columns = np.tile(dofs, (1, 12)).ravel()
    size = 6 * (count + 1)
    return csc_array((matrices.ravel(), (rows, columns)), shape=(size, size))


def _elements(span: Span, state: State, mesh: Mesh, fill: float) -> ElementSet:
    """Sections on the mesh; a chord is as flexible and as heavy as the arc it stands for."""
    line = line_of(span, state)
    shorter = mesh.chord_m / mesh.arc_length_m
    softer = shorter / flexibility_of(span, state, mesh.bend_radius_m)
    return ElementSet(
        length_m=mesh.chord_m,
        axes=element.local_axes(mesh.direction),
        offset_m=mesh.bulge_m,
        axial_rigidity_n=line.axial_n * shorter,
        bending_rigidity_n_m2=line.bending_n_m2 * softer,
        torsional_rigidity_n_m2=line.torsion_n_m2 * shorter,
        shear_rigidity_n=line.shear_n * shorter,
        mass_kg_per_m=(line.own_mass_kg_per_m + fill * line.contents_kg_per_m) / shorter,
        rotary_inertia_kg_m=line.rotary_inertia_kg_m / shorter,
    )
