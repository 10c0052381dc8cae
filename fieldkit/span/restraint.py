"""What supports and point masses add to the bare pipe: matrices of low rank."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from fieldkit.span.layout import PointMass
from fieldkit.span.supports import Spring

if TYPE_CHECKING:
    from scipy.sparse import csc_array

    from fieldkit.span.structure import Structure

Array = NDArray[np.float64]


def spring_stiffness(structure: Structure, springs: Iterable[Spring]) -> csc_array:
    """Sum of k b^T b over springs, (6N, 6N)."""
    weighted = [(s.stiffness, structure.motion_rows(s.at_m, s.axis)) for s in springs]
    return _gram(structure, weighted)


def point_mass(structure: Structure, masses: Iterable[PointMass]) -> csc_array:
    """Sum of m J^T J over point masses, (6N, 6N)."""
    weighted = [(m.mass_kg, structure.point_rows(m.at_m, m.offset_m)) for m in masses]
    return _gram(structure, weighted)


def span_matrices(
    structure: Structure, springs: Iterable[Spring], masses: Iterable[PointMass]
) -> tuple[csc_array, csc_array]:
    """(K, M) of the pipe with its supports and point masses, (6N, 6N) each."""
    stiffness = structure.stiffness + spring_stiffness(structure, springs)
    mass = structure.mass + point_mass(structure, masses)
    return stiffness.tocsc(), mass.tocsc()


def _gram(structure: Structure, weighted: list[tuple[float, Array]]) -> csc_array:
    from scipy.sparse import csc_array, csr_array

    size = structure.stiffness.shape[0]
    if not weighted:
        return csc_array((size, size))
    rows = csr_array(np.vstack([np.sqrt(weight) * motion for weight, motion in weighted]))
    return (rows.T @ rows).tocsc()
