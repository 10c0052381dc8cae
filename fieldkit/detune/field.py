"""The ensemble in the running state, read at every station: what the screening works on.

A *port* is a row of motion: a direction at a station. Fixes act on ports. For every port the
field holds the motion of each member's modes and the static flexibility that the basis leaves out
(residual flexibility: MacNeal 1971, Computers and Structures 1, 581, from memory), which does not
depend on support stiffness because the basis contains the deflection under every support.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.inside import inside_flexibility
from fieldkit.detune.reduced import (
    SHIFT_RAD2_PER_S2,
    Modes,
    ReducedModel,
    Sparse,
    mass_rows,
    solve_blocks,
    spring_rows,
)
from fieldkit.detune.tracking import central_member
from fieldkit.span.elements import cross_matrix
from fieldkit.span.layout import Span, axis_vectors
from fieldkit.span.supports import Spring, springs

Array = NDArray[np.float64]

GRID_STEPS = 64
SLOPE_STEP_M = 0.02
AXES = ("vertical", "lateral", "axial")
"""What a mode's direction is told by; the grid has more ports: x, y, z and what supports use."""


@dataclass(frozen=True)
class Spot:
    """Rows of motion at one place, along one or several directions."""

    rows: Array
    """(p, r) in the coordinates of the basis."""
    slope: Array
    """(p, r) the same per metre along the pipe."""
    full: Array
    """(p, 6N) on the full model."""
    inside: Array
    """(p, p) flexibility of the place itself between the nodes of the mesh."""


@dataclass(frozen=True)
class Ports:
    """Rows of motion on the reduced model; ports of one key belong together."""

    keys: tuple[tuple[str, float], ...]
    """(axis, station) of grid ports."""
    groups: dict[tuple[str, int], NDArray[np.intp]]
    """``(axis, station number)``, ``("spring", i)``, ``("mass", i)`` -> port numbers."""
    rows: Array
    """(ports, r)."""
    model: ReducedModel
    full_rows: Sparse
    """(ports, 6N)."""

    @cached_property
    def residual(self) -> Array:
        """(ports, ports) m/N: static flexibility that the basis cannot show."""
        return self.residual_of(self.full_rows.toarray())

    def residual_of(self, full_rows: Array) -> Array:
        """(p, p) the same between any rows (p, 6N) of the full model."""
        return self._residual_of(full_rows)

    @cached_property
    def _residual_of(self) -> Callable[[Array], Array]:
        return _residual(self.model)

    def of(self, name: str, number: int) -> NDArray[np.intp]:
        """Port numbers of a group."""
        return self.groups[(name, number)]

    @cached_property
    def motion_gram(self) -> tuple[Array, ...]:
        """(r, r) for each of AXES: phi^T G phi sums the squared motion along it over the grid."""
        along = [[i for i, (name, _) in enumerate(self.keys) if name == axis] for axis in AXES]
        return tuple(self.rows[own].T @ self.rows[own] for own in along)


@dataclass(frozen=True)
class Field:
    """Members in the running state."""

    model: ReducedModel
    span: Span
    z: Array
    """(members, parameters)."""
    modes: Modes
    station_m: Array
    """(stations,) where something can be attached or looked at."""
    ports: Ports
    central: int
    """The member nearest the middle of the ensemble."""

    def motion(self, ports: Sequence[int]) -> Array:
        """(members, p, r) motion of the modes at some ports."""
        return np.swapaxes(self._motion_by_port[list(ports)], 0, 1)

    @cached_property
    def _motion_by_port(self) -> Array:
        """(ports, members, r), as one product."""
        members, r, count = self.modes.vector.shape
        columns = np.swapaxes(self.modes.vector, 0, 1).reshape(r, members * count)
        return (self.ports.rows @ columns).reshape(-1, members, count)

    @cached_property
    def springs(self) -> tuple[Spring, ...]:
        """The springs of the span, by number."""
        return tuple(springs(self.span))

    @property
    def members(self) -> int:
        """How many parameter sets."""
        return len(self.z)

    def without(self, spring_numbers: Sequence[int], mass_numbers: Sequence[int]) -> Field:
        """The field with some springs or masses taken off, as the base for moving them."""
        stiffness, mass = self.model.matrices(self.z)
        for i in spring_numbers:
            rows = self.ports.rows[self.ports.of("spring", i)]
            stiffness = stiffness - self.spring_value(i)[:, None, None] * (rows.T @ rows)
        for i in mass_numbers:
            rows = self.ports.rows[self.ports.of("mass", i)]
            mass = mass - self.mass_value(i)[:, None, None] * (rows.T @ rows)
        return replace(self, modes=solve_blocks(stiffness, mass, self.model.blocks))

    def of(self, z: Array) -> Field:
        """Other members (members, parameters) of the same span."""
        central = central_member(z)
        z = _as_loaded(self.span, self.model, z, central)
        return replace(self, z=z, modes=self.model.modes(z), central=central)

    def some(self, members: NDArray[np.intp]) -> Field:
        """The field of some members only; the first of them counts as the middle one."""
        chosen = Modes(self.modes.eigenvalue[members], self.modes.vector[members])
        return replace(self, z=self.z[members], modes=chosen, central=0)

    def spring_value(self, i: int) -> Array:
        """(members,) stiffness of a spring of the span."""
        return self._value("spring", i, self.springs[i].stiffness)

    def mass_value(self, i: int) -> Array:
        """(members,) kilograms of a mass of the span."""
        return self._value("mass", i, self.span.masses[i].mass_kg)

    def direction_share(self, vector: Array) -> Array:
        """(members, count, 3) share of the motion of vectors (members, r, count) along AXES."""
        energy = np.stack(
            [np.sum(vector * (gram @ vector), axis=1) for gram in self.ports.motion_gram], axis=2
        )
        return np.asarray(energy / np.maximum(energy.sum(axis=2, keepdims=True), 1e-300))

    def largest_at(self, member: int, mode: int) -> float:
        """Station where a mode of a member moves most."""
        motion = (self.ports.rows @ self.modes.vector[member][:, mode]) ** 2
        total = [
            sum(float(motion[self.ports.of(axis, i)].sum()) for axis in AXES)
            for i in range(len(self.station_m))
        ]
        return float(self.station_m[int(np.argmax(total))])

    def spot(self, axes: Sequence[str], at_m: float) -> Spot:
        """Motion along some directions at any station."""
        return self._spot(tuple(axes), at_m, None)

    def mass_spot(self, i: int, at_m: float) -> Spot:
        """Motion of the centre of gravity of a mass of the span if it stood at a station."""
        return self._spot(("x", "y", "z"), at_m, self.span.masses[i].offset_m)

    def spring_spot(self, i: int) -> Spot:
        """Motion that a spring of the span resists."""
        full = spring_rows(self.model.structure, self.springs[i])
        rows = full @ self.model.basis
        return Spot(rows, np.zeros_like(rows), full, np.zeros((len(rows), len(rows))))

    def _spot(
        self, axes: tuple[str, ...], at_m: float, offset: tuple[float, float, float] | None
    ) -> Spot:
        key = (axes, at_m, offset)
        if key not in self._read:
            self._read[key] = _read_spot(self, axes, at_m, offset)
        return self._read[key]

    def motion_at(self, at_m: float) -> tuple[Array, Array, Array, Array]:
        """Translation above rotation at a station: (6, r), the same per metre, (6, 6N), and the
        flexibility (6, 6) of the place itself."""
        if at_m not in self._motion_read:
            low = max(at_m - SLOPE_STEP_M, 0.0)
            high = min(at_m + SLOPE_STEP_M, self.span.length_m)
            structure, basis = self.model.structure, self.model.basis
            before, full, after = (
                np.concatenate(structure.station_motion(station)) for station in (low, at_m, high)
            )
            slope = (after - before) @ basis / (high - low)
            inside = inside_flexibility(structure, at_m)
            self._motion_read[at_m] = (full @ basis, slope, full, inside)
        return self._motion_read[at_m]

    @cached_property
    def _motion_read(self) -> dict[float, tuple[Array, Array, Array, Array]]:
        return {}

    @cached_property
    def _read(self) -> dict[tuple[object, ...], Spot]:
        return {}

    def _value(self, role: str, index: int, stated: float) -> Array:
        for column, unknown in enumerate(self.model.unknowns):
            if (unknown.role, unknown.index) == (role, index):
                return unknown.at(self.z[:, column])
        return np.full(self.members, stated)


def _read_spot(
    base: Field, axes: tuple[str, ...], at_m: float, offset: tuple[float, float, float] | None
) -> Spot:
    tangent = base.span.centre_line.at(at_m)[1]
    here, per_metre, full, inside = base.motion_at(at_m)
    lever = np.zeros((3, 3)) if offset is None else cross_matrix(np.array(offset))
    moves = np.concatenate([np.eye(3), -lever], axis=1)
    turns = np.concatenate([np.zeros((3, 3)), np.eye(3)], axis=1)
    turn = np.concatenate(
        [
            axis_vectors(tangent, axis) @ (turns if axis in ("rotation", "torsion") else moves)
            for axis in axes
        ]
    )
    return Spot(turn @ here, turn @ per_metre, turn @ full, turn @ inside @ turn.T)


def field(span: Span, model: ReducedModel, z: Array) -> Field:
    """Read the ensemble at every station of a grid and at every support and mass."""
    central = central_member(z)
    z = _as_loaded(span, model, z, central)
    stations = np.linspace(0.0, span.length_m, GRID_STEPS + 1)
    ports = _ports(span, model, stations)
    return Field(model, span, z, model.modes(z), stations, ports, central)


def _as_loaded(span: Span, model: ReducedModel, z: Array, central: int) -> Array:
    """The middle member with its axial supports at the medians the axial force was found with.

    A full re-solve finds the force of its own supports. On a hot line that is another force, and
    scaling every member by the difference would carry one member's force to all.
    """
    if not np.any(model.structure.axial_force_n):
        return z
    along = [u.role == "spring" and springs(span)[u.index].axis == "axial" for u in model.unknowns]
    loaded = z.copy()
    loaded[central, along] = 0.0
    return loaded


def _ports(span: Span, model: ReducedModel, stations: Array) -> Ports:
    from scipy.sparse import csr_array

    structure = model.structure
    groups: dict[tuple[str, int], NDArray[np.intp]] = {}
    keys: list[tuple[str, float]] = []
    blocks: list[Array] = []
    count = 0

    def add(name: str, number: int, station: float, rows: Array) -> None:
        nonlocal count
        groups[(name, number)] = np.arange(count, count + len(rows))
        keys.extend([(name, station)] * len(rows))
        blocks.append(rows)
        count += len(rows)

    axes = dict.fromkeys((*AXES, "x", "y", "z", *(spring.axis for spring in springs(span))))
    for i, station in enumerate(map(float, stations)):
        translation, rotation = structure.station_motion(station)
        tangent = span.centre_line.at(station)[1]
        for axis in axes:
            motion = rotation if axis in ("rotation", "torsion") else translation
            add(axis, i, station, axis_vectors(tangent, axis) @ motion)
    for i, spring in enumerate(springs(span)):
        add("spring", i, spring.at_m, spring_rows(structure, spring))
    for i, mass in enumerate(span.masses):
        add("mass", i, mass.at_m, mass_rows(structure, mass))
    full = csr_array(np.concatenate(blocks))
    return Ports(tuple(keys), groups, np.asarray(full @ model.basis), model, full)


def _residual(model: ReducedModel) -> Callable[[Array], Array]:
    """Static flexibility between rows that the basis cannot show, at the prior medians."""
    from scipy.sparse.linalg import splu

    shifted = splu((model.middle_stiffness + SHIFT_RAD2_PER_S2 * model.middle_mass).tocsc())
    stiffness, mass = model.matrices(np.zeros((1, len(model.unknowns))))
    small = stiffness[0] + SHIFT_RAD2_PER_S2 * mass[0]

    def between(rows: Array) -> Array:
        whole = rows @ shifted.solve(np.ascontiguousarray(rows.T))
        reduced_rows = rows @ model.basis
        residual = whole - reduced_rows @ np.linalg.solve(small, reduced_rows.T)
        return np.asarray(0.5 * (residual + residual.T))

    return between
