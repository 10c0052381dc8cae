"""A span with its unknowns as a small model that is solved for many parameter sets at once.

Stiffness and mass are sums of constant matrices times parameter values (a spring is k b b^T, a
point mass m J^T J, a stretch of pipe its derivative with respect to relative length). Projected
on the modes at the prior medians plus the static deflections under a force at every unknown
support and mass (attachment vectors: Craig 1981, Structural Dynamics, from memory), they stay
accurate while supports go from free to rigid.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.unknowns import Unknown
from fieldkit.errors import Refusal
from fieldkit.span.layout import PointMass, Span, State
from fieldkit.span.modes import TWIST, direction_shares, solve
from fieldkit.span.structure import (
    Structure,
    assemble,
    contents_mass,
    segments,
    stretch_derivative,
    wall_derivative,
)
from fieldkit.span.supports import Spring, springs

Array = NDArray[np.float64]
Index = NDArray[np.intp]
Sparse: TypeAlias = Any

BASIS_RANGE = 1.5
"""Modes of the basis reach this many times the highest frequency asked for."""
SOFT_Z = -2.0
SHIFT_RAD2_PER_S2 = (2 * np.pi * 0.5) ** 2
"""Static deflections are taken at this shift, so that a free direction does no harm."""
COUPLED = 1e-9
"""Matrix entries smaller than this share of their diagonal are rounding."""
ABSENT = 1e-14
"""Energy below which a vector has nothing in a part."""
INDEPENDENT = 1e-10
"""Smallest relative eigenvalue of the basis' own mass matrix that still counts as a direction."""


@dataclass(frozen=True)
class Modes:
    """Modes of many members in the coordinates of the basis."""

    eigenvalue: Array
    """(members, r) rad^2/s^2, rising."""
    vector: Array
    """(members, r, r) mass-normalised columns."""

    @property
    def frequency_hz(self) -> Array:
        """(members, r)."""
        return np.sqrt(np.maximum(self.eigenvalue, 0.0)) / (2 * np.pi)


def solve_blocks(stiffness: Array, mass: Array, blocks: Sequence[Index]) -> Modes:
    """Solve many small pairs (members, r, r) that couple only within blocks of coordinates."""
    solved = [solve_many(stiffness[:, b][:, :, b], mass[:, b][:, :, b]) for b in blocks]
    return _in_order(solved, blocks)


def _in_order(solved: Sequence[Modes], blocks: Sequence[Index]) -> Modes:
    """Modes of separate blocks as modes of the whole, rising."""
    if len(blocks) == 1:
        return solved[0]
    eigenvalue = np.concatenate([modes.eigenvalue for modes in solved], axis=1)
    members, r = eigenvalue.shape
    order = np.argsort(eigenvalue, axis=1)
    rank = np.argsort(order, axis=1)
    vector = np.zeros((members, r, r))
    every = np.arange(members)[:, None, None]
    for block, modes in zip(blocks, solved, strict=True):
        vector[every, block[None, :, None], rank[:, None, block]] = modes.vector
    return Modes(np.take_along_axis(eigenvalue, order, axis=1), vector)


def _sum(base: Array, value: Array, terms: Array) -> Array:
    """(members, r, r) base plus value times terms."""
    r = len(base)
    return np.asarray(base + (value @ terms.reshape(len(terms), r * r)).reshape(-1, r, r))


def solve_many(stiffness: Array, mass: Array) -> Modes:
    """Solve many small symmetric pairs, both (members, r, r)."""
    lower = np.linalg.cholesky(mass)
    inverse = np.linalg.inv(lower)
    standard = inverse @ stiffness @ np.swapaxes(inverse, 1, 2)
    eigenvalue, vector = np.linalg.eigh(0.5 * (standard + np.swapaxes(standard, 1, 2)))
    return Modes(eigenvalue, np.swapaxes(inverse, 1, 2) @ vector)


@dataclass(frozen=True)
class FullTerms:
    """The constant matrices of a span with unknowns, full size, sparse."""

    structure: Structure
    stiffness: Sparse
    mass: Sparse
    stiffness_terms: tuple[Sparse | None, ...]
    mass_terms: tuple[Sparse | None, ...]
    reference: Array
    """(parameters,) physical values at which the base matrices stand."""
    ports: dict[int, Array]
    """Rows where unknown springs and masses act, by number of the parameter."""


@dataclass(frozen=True)
class ReducedModel:
    """A span in one state, projected on its basis."""

    unknowns: tuple[Unknown, ...]
    structure: Structure
    basis: Array
    """(6N, r)."""
    blocks: tuple[Index, ...]
    """Coordinates that couple with each other only, such as the two planes of a straight pipe."""
    stiffness: Array
    mass: Array
    stiffness_terms: Array
    """(parameters, r, r)."""
    mass_terms: Array
    reference: Array
    port_rows: dict[int, Array]
    """(k, r) motion that each unknown spring or mass meets, by number of the parameter."""
    middle_stiffness: Sparse
    """(6N, 6N) every unknown at its prior median."""
    middle_mass: Sparse

    def values(self, z: Array) -> Array:
        """(members, parameters) physical values less the reference."""
        columns = [unknown.at(z[:, i]) for i, unknown in enumerate(self.unknowns)]
        return np.stack(columns, axis=1) - self.reference

    def matrices(self, z: Array) -> tuple[Array, Array]:
        """Stiffness and mass of each member, both (members, r, r)."""
        value = self.values(z)
        return (
            _sum(self.stiffness, value, self.stiffness_terms),
            _sum(self.mass, value, self.mass_terms),
        )

    def modes(self, z: Array) -> Modes:
        """Solve every member; ``z`` is (members, parameters) in standard-normal numbers."""
        value = self.values(z)
        solved = [
            solve_many(_sum(K, value, dK), _sum(M, value, dM)) for K, dK, M, dM in self._parts
        ]
        return _in_order(solved, self.blocks)

    @cached_property
    def _parts(self) -> list[tuple[Array, Array, Array, Array]]:
        """Base and terms of stiffness and mass, block by block."""
        return [
            (
                self.stiffness[np.ix_(b, b)],
                np.ascontiguousarray(self.stiffness_terms[:, b][:, :, b]),
                self.mass[np.ix_(b, b)],
                np.ascontiguousarray(self.mass_terms[:, b][:, :, b]),
            )
            for b in self.blocks
        ]

    def frequency_slopes(self, z: Array, modes: Modes, count: int) -> Array:
        """(members, parameters, count) d frequency_hz / d z by modal sensitivity.

        d lambda = phi^T (dK - lambda dM) phi (Fox and Kapoor 1968, AIAA Journal 6, from memory).
        """
        vector = modes.vector[:, :, :count]
        eigenvalue = modes.eigenvalue[:, :count]
        slope = self._slopes_of_ports(vector, eigenvalue)
        for own, (_, stiff, _, heavy) in zip(self.blocks, self._parts, strict=True):
            part = np.ascontiguousarray(vector[:, own])
            for i in self._spread_out:
                if stiff[i].any():
                    slope[:, i] += _quadratic(stiff[i], part)
                if heavy[i].any():
                    slope[:, i] -= eigenvalue * _quadratic(heavy[i], part)
        chain = np.stack([u.slope(z[:, i]) for i, u in enumerate(self.unknowns)], axis=1)
        frequency = np.maximum(modes.frequency_hz[:, :count], 1e-6)
        return np.asarray(slope * chain[:, :, None] / (8 * np.pi**2 * frequency[:, None, :]))

    def _slopes_of_ports(self, vector: Array, eigenvalue: Array) -> Array:
        """(members, parameters, count) the part of springs and masses, which act at a point."""
        slope = np.zeros((len(vector), len(self.unknowns), vector.shape[2]))
        if not self.port_rows:
            return slope
        motion = (np.concatenate(list(self.port_rows.values())) @ vector) ** 2
        at = 0
        for i, rows in self.port_rows.items():
            slope[:, i] = motion[:, at : at + len(rows)].sum(axis=1)
            if self.unknowns[i].role == "mass":
                slope[:, i] *= -eigenvalue
            at += len(rows)
        return slope

    @cached_property
    def _spread_out(self) -> list[int]:
        """Parameters that act along the pipe."""
        return [i for i in range(len(self.unknowns)) if i not in self.port_rows]


def _quadratic(term: Array, vector: Array) -> Array:
    """(members, count) phi^T A phi for one symmetric matrix and many vectors."""
    return np.asarray(np.einsum("sij,sij->sj", vector, term @ vector))


def build(span: Span, state: State, unknowns: Sequence[Unknown], up_to_hz: float) -> ReducedModel:
    """The reduced model of a span in a state, accurate up to ``up_to_hz``."""
    terms = full_terms(span, state, unknowns, up_to_hz)
    parts = _basis(terms, unknowns, up_to_hz)
    return project(terms, unknowns, parts)


def project(terms: FullTerms, unknowns: Sequence[Unknown], parts: Sequence[Array]) -> ReducedModel:
    """Project full matrices on a basis given in uncoupled parts (6N, r of the part)."""
    basis = np.concatenate(parts, axis=1)
    ends = np.cumsum([part.shape[1] for part in parts])
    blocks = tuple(np.arange(e - p.shape[1], e) for e, p in zip(ends, parts, strict=True))

    def reduce(matrix: Sparse | None) -> Array:
        r = basis.shape[1]
        if matrix is None:
            return np.zeros((r, r))
        return np.asarray(basis.T @ (matrix @ basis))

    return ReducedModel(
        tuple(unknowns),
        terms.structure,
        basis,
        blocks,
        reduce(terms.stiffness),
        reduce(terms.mass),
        np.stack([reduce(term) for term in terms.stiffness_terms]),
        np.stack([reduce(term) for term in terms.mass_terms]),
        terms.reference,
        {i: rows @ basis for i, rows in terms.ports.items()},
        *_full_at(terms, unknowns, np.zeros(len(unknowns))),
    )


def full_terms(span: Span, state: State, unknowns: Sequence[Unknown], up_to_hz: float) -> FullTerms:
    """Assemble the pipe once and write every unknown as a matrix of its own."""
    from scipy import sparse

    structure = assemble(span, state, up_to_hz=up_to_hz)
    stiffness, mass = structure.stiffness.copy(), structure.mass.copy()
    all_springs = springs(span)
    free_springs = {u.index for u in unknowns if u.role == "spring"}
    free_masses = {u.index for u in unknowns if u.role == "mass"}
    for i, spring in enumerate(all_springs):
        if i not in free_springs:
            stiffness = stiffness + spring.stiffness * _outer(spring_rows(structure, spring))
    for i, point_mass in enumerate(span.masses):
        if i not in free_masses:
            mass = mass + point_mass.mass_kg * _outer(mass_rows(structure, point_mass))
    lengths = segments(span)
    stiffness_terms: list[Sparse | None] = []
    mass_terms: list[Sparse | None] = []
    ports: dict[int, Array] = {}
    for i, unknown in enumerate(unknowns):
        dK: Sparse | None = None
        dM: Sparse | None = None
        if unknown.role == "spring":
            rows = spring_rows(structure, all_springs[unknown.index])
            dK = _outer(rows)
            ports[i] = rows
        elif unknown.role == "mass":
            rows = mass_rows(structure, span.masses[unknown.index])
            dM = _outer(rows)
            ports[i] = rows
        elif unknown.role == "length":
            dK, dM = stretch_derivative(structure, *lengths[unknown.index])
        elif unknown.role == "wall":
            dK, dM = wall_derivative(structure)
        elif unknown.role == "modulus":
            dK = structure.stiffness
        elif unknown.role == "fill" and unknown.state == state.name:
            dM = contents_mass(structure)
        stiffness_terms.append(dK)
        mass_terms.append(dM)
    reference = np.array([_reference(unknown) for unknown in unknowns])
    return FullTerms(
        structure,
        sparse.csc_matrix(stiffness),
        sparse.csc_matrix(mass),
        tuple(stiffness_terms),
        tuple(mass_terms),
        reference,
        ports,
    )


def spring_rows(structure: Structure, spring: Spring) -> Array:
    """(k, 6N) motion of the pipe that a spring of a support resists."""
    return structure.motion_rows(spring.at_m, spring.axis)


def mass_rows(structure: Structure, mass: PointMass) -> Array:
    """(3, 6N) motion of a mass' centre of gravity."""
    return structure.point_rows(mass.at_m, mass.offset_m)


def _outer(rows: Array) -> Sparse:
    from scipy import sparse

    thin = sparse.csc_matrix(rows)
    return thin.T @ thin


def _reference(unknown: Unknown) -> float:
    """Where the assembled pipe stands: nominal dimensions and fill, no unknown spring or mass."""
    if unknown.role == "fill":
        return unknown.centre
    return 0.0 if unknown.role in ("spring", "mass") else 1.0


def _full_at(terms: FullTerms, unknowns: Sequence[Unknown], z: Array) -> tuple[Sparse, Sparse]:
    """Full sparse stiffness and mass of one member; ``z`` is (parameters,)."""
    stiffness, mass = terms.stiffness, terms.mass
    for i, unknown in enumerate(unknowns):
        value = float(unknown.at(z[i : i + 1])[0]) - terms.reference[i]
        dK, dM = terms.stiffness_terms[i], terms.mass_terms[i]
        if dK is not None and value:
            stiffness = stiffness + value * dK
        if dM is not None and value:
            mass = mass + value * dM
    return stiffness, mass


def _basis(terms: FullTerms, unknowns: Sequence[Unknown], up_to_hz: float) -> list[Array]:
    """Modes at the medians and with soft springs, and attachment vectors.

    In parts (6N, r of the part) that no parameter couples, each mass-orthonormal.
    """
    from scipy.sparse import csc_matrix
    from scipy.sparse.linalg import splu

    middle = np.zeros(len(unknowns))
    stiffness, mass = _full_at(terms, unknowns, middle)
    _, vectors = solve(stiffness, mass, up_to_hz=BASIS_RANGE * up_to_hz)
    columns = [_felt(terms, vectors), *_soft_modes(terms, unknowns, mass, up_to_hz)]
    if terms.ports:
        shifted = csc_matrix(stiffness + SHIFT_RAD2_PER_S2 * mass)
        columns.append(splu(shifted).solve(np.concatenate(list(terms.ports.values())).T))
    every = np.concatenate(columns, axis=1)
    parts = [_orthonormal(np.where(own[:, None], every, 0.0), mass) for own in _uncoupled(terms)]
    return [part for part in parts if part.shape[1]]


def _soft_modes(
    terms: FullTerms, unknowns: Sequence[Unknown], mass: Sparse, up_to_hz: float
) -> list[Array]:
    """Modes with soft springs; none where a hot line would buckle on them."""
    soft = np.array([SOFT_Z if u.role == "spring" else 0.0 for u in unknowns])
    stiffness, _ = _full_at(terms, unknowns, soft)
    try:
        return [_felt(terms, solve(stiffness, mass, up_to_hz=up_to_hz)[1])]
    except Refusal:
        return []


def _uncoupled(terms: FullTerms) -> list[NDArray[np.bool_]]:
    """Masks (6N,) of the degrees of freedom that some matrix couples with each other."""
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import connected_components

    size = terms.stiffness.shape[0]
    rows, columns = [], []
    for matrix in (terms.stiffness, terms.mass, *terms.stiffness_terms, *terms.mass_terms):
        if matrix is None:
            continue
        entries = matrix.tocoo()
        scale = np.sqrt(np.abs(matrix.diagonal()))
        linked = np.abs(entries.data) > COUPLED * scale[entries.row] * scale[entries.col]
        rows.append(entries.row[linked])
        columns.append(entries.col[linked])
    row, column = np.concatenate(rows), np.concatenate(columns)
    graph = coo_array((np.ones(len(row)), (row, column)), shape=(size, size))
    count, label = connected_components(graph, directed=False)
    return [label == i for i in range(count)]


def _felt(terms: FullTerms, vectors: Array) -> Array:
    """Vectors without those that only twist the pipe about its own axis."""
    structure = terms.structure
    twist = direction_shares(structure, structure.span.masses, vectors)[:, 3]
    return vectors[:, twist < TWIST]


def _orthonormal(columns: Array, mass: Sparse) -> Array:
    """Mass-orthonormal columns that span the same space, near-dependent directions left out."""
    energy = np.sum(columns * (mass @ columns), axis=0)
    present = energy > ABSENT * max(float(energy.max(initial=0.0)), ABSENT)
    if not present.any():
        return columns[:, :0]
    scaled = columns[:, present] / np.sqrt(energy[present])
    gram = scaled.T @ (mass @ scaled)
    eigenvalue, vector = np.linalg.eigh(0.5 * (gram + gram.T))
    kept = eigenvalue > INDEPENDENT * eigenvalue[-1]
    return np.asarray(scaled @ (vector[:, kept] / np.sqrt(eigenvalue[kept])))
