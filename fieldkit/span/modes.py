"""Natural modes of a span: frequency, direction, shape and where they move most.

M phi = (1/lambda) K phi is solved rather than K phi = lambda M phi, which loses digits on the
lowest modes of a fine mesh.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import Refusal
from fieldkit.span.factor import Factor, rounding_floor
from fieldkit.span.layout import PointMass, Span, State, axis_vectors, is_vertical
from fieldkit.span.restraint import span_matrices
from fieldkit.span.structure import Structure, assemble
from fieldkit.span.supports import springs

if TYPE_CHECKING:
    from scipy.sparse import csc_array

__all__ = ["Mode", "direction_shares", "free_directions", "solve", "span_matrices", "span_modes"]

Array = NDArray[np.float64]

DENSE_UP_TO = 150
"""Size of matrix below which a dense solver is quickest."""
EQUAL = 1e-6
"""Relative difference below which two frequencies are one, with any direction in their plane."""
MIXED = 0.3
"""Share of the lesser of vertical and lateral above which a mode is called both."""
MOST_MODES = 200
"""Of one span below the limit; more take minutes, and no list of them helps anyone."""
TWIST = 0.99
"""Share of energy in turning about the pipe's own axis above which nothing of a mode is felt."""


@dataclass(frozen=True)
class Mode:
    """One natural mode."""

    frequency_hz: float
    direction: str
    """``vertical``, ``lateral``, ``axial`` or ``vertical+lateral``."""
    where_m: float
    """Station of largest motion."""
    station_m: Array
    """(N,)"""
    shape: Array
    """(N, 3) displacement, largest 1."""


def span_modes(span: Span, state: State, up_to_hz: float) -> tuple[Mode, ...]:
    """Modes up to a frequency, every unknown stiffness at its median.

    Rigid motions that nothing holds are left out (see ``free_directions``), and so are modes that
    only twist the pipe about its own axis. Refusal where the span buckles.
    """
    structure = assemble(span, state, up_to_hz=up_to_hz)
    stiffness, mass = span_matrices(structure, springs(span), span.masses)
    frequency, vectors = solve(stiffness, mass, up_to_hz=up_to_hz)
    vectors = _untangled(structure, span.masses, frequency, vectors)
    shares = direction_shares(structure, span.masses, vectors)
    return tuple(
        _mode(structure, float(f), vector, share)
        for f, vector, share in zip(frequency, vectors.T, shares, strict=True)
        if share[3] < TWIST
    )


def solve(
    stiffness: csc_array,
    mass: csc_array,
    *,
    up_to_hz: float | None = None,
    count: int | None = None,
) -> tuple[Array, Array]:
    """(frequency_hz (k,), vectors (6N, k) with unit modal mass) in rising order.

    Limited to ``up_to_hz`` or the first ``count``, whichever ends earlier. Rigid motions (below
    0.1 Hz or lost in rounding) are left out. Refusal where the stiffness is not positive, or where
    the modes are too many.
    """
    floor = rounding_floor(stiffness, mass)
    steadied = (stiffness + floor * mass).tocsc()
    factor = Factor(steadied)
    if factor.negatives:
        raise Refusal(
            "this span has no stable equilibrium: its axial force exceeds what holds it straight",
            "check temperature, pressure and how the supports hold the pipe along its axis",
        )
    size = stiffness.shape[0]
    wanted = size if up_to_hz is None else _count_below(stiffness, mass, up_to_hz)
    if count is not None:
        rigid = _count_below(stiffness, mass, _lowest_hz(floor))
        wanted = min(wanted, count + rigid)
    if up_to_hz is not None and wanted > MOST_MODES:
        raise Refusal(
            f"{wanted} modes lie below {up_to_hz:g} Hz on this span, more than {MOST_MODES}",
            "lower the frequency limit (goal.up_to), or describe a shorter part of the line",
        )
    if size <= DENSE_UP_TO or 3 * wanted > size:
        eigenvalue, vectors = _dense(steadied.toarray(), mass.toarray())
    else:
        eigenvalue, vectors = _subspace(factor, steadied, mass, wanted, floor)
    frequency = np.sqrt(np.clip(eigenvalue - floor, 0.0, None)) / (2 * np.pi)
    keep = frequency > _lowest_hz(floor)
    if up_to_hz is not None:
        keep &= frequency <= up_to_hz
    return frequency[keep][:count], vectors[:, keep][:, :count]


def free_directions(span: Span) -> tuple[str, ...]:
    """Directions (``x``, ``y``, ``z``) along which no support holds the span."""
    held = np.zeros(3)
    for spring in springs(span):
        if spring.axis not in ("rotation", "torsion"):
            vectors = axis_vectors(span.centre_line.at(spring.at_m)[1], spring.axis)
            held += np.sum(vectors**2, axis=0)
    return tuple(name for name, amount in zip("xyz", held, strict=True) if amount < 1e-9)


def direction_shares(structure: Structure, masses: tuple[PointMass, ...], vectors: Array) -> Array:
    """Share (k, 4) of each vector's kinetic energy that is vertical, lateral, axial, and twist.

    Directions are those of the pipe where it moves; on a riser all motion along z counts as
    vertical. Twist is turning about the pipe's own axis.
    """
    energies = np.stack(
        [
            np.sum(rows**2, axis=0)
            for rows in (*_motions(structure, masses, vectors), _twist(structure, vectors))
        ],
        axis=1,
    )
    shares: Array = energies / energies.sum(axis=1, keepdims=True)
    return shares


def _lowest_hz(floor: float) -> float:
    return 5 * float(np.sqrt(floor)) / (2 * np.pi)


def _count_below(stiffness: csc_array, mass: csc_array, frequency_hz: float) -> int:
    """Number of modes below a frequency, rigid motions included, by the law of inertia."""
    shifted = stiffness - (2 * np.pi * frequency_hz) ** 2 * mass
    return Factor(shifted.tocsc()).negatives


def _dense(stiffness: Array, mass: Array) -> tuple[Array, Array]:
    """All eigenvalues rising and vectors of unit modal mass."""
    lower = np.linalg.cholesky(stiffness)
    half = np.linalg.solve(lower, mass)
    inverse, turned = np.linalg.eigh(np.linalg.solve(lower, half.T))
    rising = slice(None, None, -1)
    eigenvalue = 1 / np.clip(inverse[rising], np.finfo(float).tiny, None)
    vectors = np.linalg.solve(lower.T, turned[:, rising])
    return eigenvalue, vectors * np.sqrt(eigenvalue)


def _subspace(
    factor: Factor, stiffness: csc_array, mass: csc_array, wanted: int, floor: float
) -> tuple[Array, Array]:
    """The lowest ``wanted`` modes by subspace iteration, safe with repeated frequencies.

    Ends when no eigenvalue still moves by more than 1e-8 of itself, or by rounding near ``floor``.
    """
    size = stiffness.shape[0]
    block = min(size, max(2 * wanted, wanted + 8))
    basis = np.random.default_rng(1).standard_normal((size, block))
    previous = np.full(wanted, np.inf)
    for _ in range(60):
        basis = np.linalg.qr(factor.solve(mass @ basis))[0]
        inner_stiffness = basis.T @ (stiffness @ basis)
        inner_mass = basis.T @ (mass @ basis)
        eigenvalue, turn = _dense(inner_stiffness, inner_mass)
        basis = basis @ turn
        change = np.abs(eigenvalue[:wanted] - previous)
        if np.all(change <= 1e-8 * eigenvalue[:wanted] + 1e-6 * floor):
            return eigenvalue[:wanted], basis[:, :wanted]
        previous = eigenvalue[:wanted]
    return _dense(stiffness.toarray(), mass.toarray())


def _motions(
    structure: Structure, masses: tuple[PointMass, ...], vectors: Array
) -> tuple[Array, Array, Array]:
    """Mass-weighted vertical, lateral and axial motion of nodes and point masses, (.., k) each."""
    nodal = vectors.reshape(len(structure.station_m), 6, -1)[:, :3]
    weighted = np.sqrt(_node_mass(structure))[:, None, None] * nodal
    lines, line_of = np.unique(structure.tangent.round(9), axis=0, return_inverse=True)
    moved = [(line, weighted[line_of == i]) for i, line in enumerate(lines)]
    for item in masses:
        line = structure.span.centre_line.at(item.at_m)[1]
        rows = structure.point_rows(item.at_m, item.offset_m)
        moved.append((line, (np.sqrt(item.mass_kg) * (rows @ vectors))[None]))
    split = [[axes @ motion for axes in _axes(line)] for line, motion in moved]
    vertical, lateral, along = (
        np.concatenate([part.reshape(len(part) * part.shape[1], part.shape[2]) for part in parts])
        for parts in zip(*split, strict=True)
    )
    return vertical, lateral, along


def _axes(tangent: Array) -> tuple[Array, Array, Array]:
    along = np.zeros((0, 3)) if is_vertical(tangent) else axis_vectors(tangent, "axial")
    return axis_vectors(tangent, "vertical"), axis_vectors(tangent, "lateral"), along


def _twist(structure: Structure, vectors: Array) -> Array:
    """Inertia-weighted turning of nodes about the pipe's axis, (N, k)."""
    nodal = vectors.reshape(len(structure.station_m), 6, -1)[:, 3:]
    polar = 2 * structure.elements.rotary_inertia_kg_m * structure.elements.length_m
    about = np.einsum("ni,nik->nk", structure.tangent, nodal)
    weighted: Array = np.sqrt(_shared(polar))[:, None] * about
    return weighted


def _node_mass(structure: Structure) -> Array:
    return _shared(structure.elements.mass_kg_per_m * structure.elements.length_m)


def _shared(of_element: Array) -> Array:
    """Element amounts (E,) given half and half to their nodes (N,)."""
    nodal = np.zeros(len(of_element) + 1)
    nodal[:-1] += of_element / 2
    nodal[1:] += of_element / 2
    return nodal


def _untangled(
    structure: Structure, masses: tuple[PointMass, ...], frequency: Array, vectors: Array
) -> Array:
    """Vectors turned within each set of equal frequencies so that each keeps to one direction."""
    clean = vectors.copy()
    breaks = np.flatnonzero(np.diff(frequency) > EQUAL * frequency[1:]) + 1
    for group in np.split(np.arange(len(frequency)), breaks):
        if len(group) > 1:
            vertical = _motions(structure, masses, vectors[:, group])[0]
            turn = np.linalg.eigh(vertical.T @ vertical)[1]
            clean[:, group] = vectors[:, group] @ turn[:, ::-1]
    return clean


def _mode(structure: Structure, frequency_hz: float, vector: Array, share: Array) -> Mode:
    shape = vector.reshape(-1, 6)[:, :3]
    size = np.linalg.norm(shape, axis=1)
    where = int(np.argmax(size))
    sign = np.sign(shape[where, int(np.argmax(np.abs(shape[where])))])
    return Mode(
        frequency_hz=frequency_hz,
        direction=direction_name(share),
        where_m=float(structure.station_m[where]),
        station_m=structure.station_m,
        shape=sign * shape / size[where],
    )


def direction_name(share: Array) -> str:
    """Name of the direction of a row of ``direction_shares``."""
    vertical, lateral, along = share[:3]
    across = vertical + lateral
    if along > across:
        return "axial"
    if min(vertical, lateral) > MIXED * across:
        return "vertical+lateral"
    return "vertical" if vertical >= lateral else "lateral"
