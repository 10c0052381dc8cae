"""A span with unknowns as constant matrices, one for every unknown, full size and sparse.

Stiffness and mass are sums of constant matrices times parameter values: a spring is k b b^T, a
point mass m J^T J, a stretch of pipe its derivative with respect to relative length.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.unknowns import Unknown
from fieldkit.span.layout import PointMass, Span, State
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
Sparse: TypeAlias = Any


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


def full_at(terms: FullTerms, unknowns: Sequence[Unknown], z: Array) -> tuple[Sparse, Sparse]:
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
