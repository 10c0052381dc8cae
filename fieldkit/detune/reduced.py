"""A span with its unknowns as a small model that is solved for many parameter sets at once.

The constant matrices of ``terms`` projected on the shapes of ``basis``.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.basis import SHIFT_RAD2_PER_S2, basis_parts
from fieldkit.detune.many import Index, Modes, in_order, solve_blocks, solve_many
from fieldkit.detune.terms import FullTerms, Sparse, full_at, full_terms, mass_rows, spring_rows
from fieldkit.detune.unknowns import Unknown
from fieldkit.span.layout import Span, State
from fieldkit.span.structure import Structure

__all__ = [
    "SHIFT_RAD2_PER_S2",
    "Modes",
    "ReducedModel",
    "Sparse",
    "build",
    "mass_rows",
    "project",
    "same_mesh",
    "solve_blocks",
    "solve_many",
    "spring_rows",
]

Array = NDArray[np.float64]


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
        return in_order(solved, self.blocks)

    def modes_among(self, z: Array, shapes: Array) -> Modes:
        """Modes of every member as sums of its own shapes (members, r, count): Ritz's method."""
        stiffness, mass = self.matrices(z)
        across = np.swapaxes(shapes, 1, 2)
        found = solve_many(across @ (stiffness @ shapes), across @ (mass @ shapes))
        return Modes(found.eigenvalue, shapes @ found.vector)

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
    parts = basis_parts(terms, unknowns, up_to_hz)
    return project(terms, unknowns, parts)


def same_mesh(models: Sequence[ReducedModel]) -> bool:
    """Whether models of one span in several states have their nodes at the same places."""
    first = models[0].structure.station_m
    stations = [model.structure.station_m for model in models]
    return all(len(own) == len(first) and np.allclose(own, first) for own in stations)


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
        *full_at(terms, unknowns, np.zeros(len(unknowns))),
    )


def _sum(base: Array, value: Array, terms: Array) -> Array:
    """(members, r, r) base plus value times terms."""
    r = len(base)
    return np.asarray(base + (value @ terms.reshape(len(terms), r * r)).reshape(-1, r, r))
