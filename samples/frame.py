"""A pipe as a frame of many short members with its mass in lumps at the nodes.

Elbows are chords. Mass and rotary inertia sit at the nodes, so the frequencies approach those of
the continuous pipe from below as the step shrinks.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from member import Array, Block, Member, Tube
from numpy.typing import NDArray
from route import Leg, Stretch, axis_vectors, mesh_stations, stretch_at, stretches
from scipy.sparse import coo_array, csc_array
from scipy.sparse.linalg import eigsh, spsolve


@dataclass(frozen=True)
class Hold:
    """Springs on the pipe at a station: N/m by axis, N m/rad for ``rotation`` and ``twist``."""

    at_m: float
    springs: dict[str, float]


@dataclass(frozen=True)
class Lump:
    """A point mass whose centre of gravity stands off the centre line by ``offset_m``."""

    at_m: float
    mass_kg: float
    offset_m: tuple[float, float, float] = (0.0, 0.0, 0.0)


@dataclass(frozen=True)
class Pipework:
    """Everything that is built."""

    legs: tuple[Leg, ...]
    tube: Tube
    holds: tuple[Hold, ...] = ()
    lumps: tuple[Lump, ...] = ()
    looked_at_m: tuple[float, ...] = ()
    """Stations that must be nodes because something is measured or struck there."""
    with_elbow_flexibility: bool = True
    axial_force_n: float | None = None
    """Tension in every member; None where heat and pressure against the springs decide."""


@dataclass(frozen=True)
class Frame:
    """Assembled matrices; six unknowns a node: x, y, z and the turns about them."""

    line: list[Stretch]
    stations: Array
    stiffness: csc_array
    mass: csc_array

    def node(self, at_m: float) -> int:
        """The node at a station that was marked."""
        return int(np.argmin(np.abs(self.stations - at_m)))


@dataclass(frozen=True)
class Modes:
    """Natural modes with unit modal mass."""

    frame: Frame
    frequency_hz: Array
    shape: Array
    """(modes, nodes, 6)."""

    def along(self, at_m: float, axis: str | Array) -> Array:
        """(modes,) movement at a station along a named axis or a vector."""
        direction = stretch_at(self.frame.line, at_m).locate(at_m)[1]
        vector = axis_vectors(direction, axis)[0] if isinstance(axis, str) else axis
        return self.shape[:, self.frame.node(at_m), :3] @ vector


def assemble(pipework: Pipework, step_m: float = 0.02, chords: int = 24) -> Frame:
    """Stiffness and mass of the pipework, with the axial force that heat and pressure cause."""
    line = stretches(pipework.legs)
    marked = [hold.at_m for hold in pipework.holds] + [lump.at_m for lump in pipework.lumps]
    stations = mesh_stations(line, [*marked, *pipework.looked_at_m], step_m, chords)
    members = _members(pipework, line, stations)
    blocks: list[Block] = [(m.nodes, m.stiffness()) for m in members]
    blocks += [block for hold in pipework.holds for block in _springs(hold, line, stations)]
    elastic = _gather(blocks, len(stations))
    force = _axial_forces(pipework, members, elastic)
    pulled: list[Block] = [
        (m.nodes, m.stiffness_of_pull(n)) for m, n in zip(members, force, strict=True)
    ]
    masses = [pair for m in members for pair in m.lumped_mass()]
    masses += [_lump(lump, stations) for lump in pipework.lumps]
    stiffness = elastic + _gather(pulled, len(stations))
    return Frame(line, stations, stiffness, _gather(masses, len(stations)))


def solve(frame: Frame, up_to_hz: float, first_guess: int = 24) -> Modes:
    """Every mode up to a frequency, by shift-and-invert Lanczos about zero."""
    size, count = frame.stiffness.shape[0], first_guess
    start = np.random.default_rng(7).standard_normal(size)
    shift = -((2 * math.pi * 0.5) ** 2)
    while True:
        count = min(count, size - 2)
        values, vectors = eigsh(frame.stiffness, count, frame.mass, sigma=shift, v0=start)
        order = np.argsort(values)
        frequency = np.sqrt(np.maximum(values[order], 0.0)) / (2 * math.pi)
        if frequency[-1] > up_to_hz or count == size - 2:
            break
        count *= 2
    kept = order[frequency <= up_to_hz]
    shape = vectors[:, kept].T.reshape(len(kept), -1, 6)
    return Modes(frame, frequency[frequency <= up_to_hz], shape)


def _members(pipework: Pipework, line: list[Stretch], stations: Array) -> list[Member]:
    members = []
    for i, (a, b) in enumerate(pairwise(stations)):
        piece = stretch_at(line, (a + b) / 2)
        share = (b - a) / (piece.end_m - piece.start_m)
        radius = float(np.linalg.norm(piece.points[1])) if piece.is_elbow else math.inf
        length = radius * piece.angle_rad * share if piece.is_elbow else b - a
        bends = piece.is_elbow and pipework.with_elbow_flexibility
        factor = pipework.tube.elbow_flexibility(radius) if bends else 1.0
        ends = (piece.locate(a)[0], piece.locate(b)[0])
        members.append(Member((i, i + 1), ends, float(length), pipework.tube, factor))
    return members


def _springs(hold: Hold, line: list[Stretch], stations: Array) -> list[Block]:
    node = int(np.argmin(np.abs(stations - hold.at_m)))
    direction = stretch_at(line, hold.at_m).locate(hold.at_m)[1]
    blocks: list[Block] = []
    for axis, stiffness in hold.springs.items():
        first = 3 if axis in ("rotation", "twist") else 0
        block = np.zeros((6, 6))
        vectors = axis_vectors(direction, axis)
        block[first : first + 3, first : first + 3] = stiffness * vectors.T @ vectors
        blocks.append(((node,), block))
    return blocks


def _lump(lump: Lump, stations: Array) -> Block:
    x, y, z = lump.offset_m
    lever = np.array([[0, z, -y], [-z, 0, x], [y, -x, 0]])
    carry = np.hstack([np.eye(3), lever])
    node = int(np.argmin(np.abs(stations - lump.at_m)))
    return (node,), lump.mass_kg * carry.T @ carry


def _axial_forces(pipework: Pipework, members: list[Member], elastic: csc_array) -> Array:
    """Effective tension of each member: wall force less pressure times bore area."""
    if pipework.axial_force_n is not None:
        return np.full(len(members), pipework.axial_force_n)
    if pipework.tube.heated_strain == 0 and pipework.tube.pressure_pa == 0:
        return np.zeros(len(members))
    load = np.zeros(elastic.shape[0])
    for member in members:
        push, _ = member.heat_force()
        load[_unknowns(member.nodes)] += push
    movement = spsolve(elastic, load)
    return np.array([_tension(member, movement) for member in members])


def _tension(member: Member, movement: Array) -> float:
    tube, held = member.tube, member.heat_force()[1]
    strain = member.stretch(movement[_unknowns(member.nodes)]) / member.length
    return held + tube.modulus_pa * tube.area * strain


def _unknowns(nodes: tuple[int, ...]) -> NDArray[np.int64]:
    return np.concatenate([6 * node + np.arange(6) for node in nodes])


def _gather(blocks: list[Block], nodes: int) -> csc_array:
    rows, columns, values = [], [], []
    for at, block in blocks:
        unknowns = _unknowns(at)
        rows.append(np.repeat(unknowns, len(unknowns)))
        columns.append(np.tile(unknowns, len(unknowns)))
        values.append(block.ravel())
    index = (np.concatenate(rows), np.concatenate(columns))
    return coo_array((np.concatenate(values), index), shape=(6 * nodes, 6 * nodes)).tocsc()
