"""The shapes a span's members move in: modes, and static deflections under every unknown.

Modes at the prior medians and with soft springs, plus the deflections under a force at every
unknown support and mass (attachment vectors: Craig 1981, Structural Dynamics, from memory), stay
accurate while supports go from free to rigid.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.terms import FullTerms, Sparse, full_at
from fieldkit.detune.unknowns import Unknown
from fieldkit.errors import Refusal
from fieldkit.span.modes import TWIST, direction_shares, solve

Array = NDArray[np.float64]

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


def basis_parts(terms: FullTerms, unknowns: Sequence[Unknown], up_to_hz: float) -> list[Array]:
    """Modes at the medians and with soft springs, and attachment vectors.

    In parts (6N, r of the part) that no parameter couples, each mass-orthonormal.
    """
    from scipy.sparse import csc_matrix
    from scipy.sparse.linalg import splu

    middle = np.zeros(len(unknowns))
    stiffness, mass = full_at(terms, unknowns, middle)
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
    stiffness, _ = full_at(terms, unknowns, soft)
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
