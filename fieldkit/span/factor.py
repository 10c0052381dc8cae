"""Factorisation of a span's sparse symmetric matrices, with the count of negative eigenvalues.

The nodes of a span form a chain in order, so the matrices are banded and the natural order fills
in nothing beyond the band.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from scipy.sparse import csc_array

Array = NDArray[np.float64]


class Factor:
    """L D L^T of a symmetric matrix, without pivoting unless a pivot is zero."""

    def __init__(self, matrix: csc_array) -> None:
        from scipy.sparse.linalg import splu

        options = {"SymmetricMode": True, "Equil": False}
        self._matrix = matrix
        self._lu = splu(matrix, permc_spec="NATURAL", diag_pivot_thresh=0.0, options=options)

    @property
    def negatives(self) -> int:
        """Number of negative eigenvalues (Sylvester's law of inertia)."""
        if np.array_equal(self._lu.perm_r, self._lu.perm_c):
            return int(np.sum(self._lu.U.diagonal() < 0))
        return int(np.sum(np.linalg.eigvalsh(self._matrix.toarray()) < 0))

    def solve(self, right: Array) -> Array:
        """Solution for one (n,) or several (n, k) right-hand sides."""
        solution: Array = self._lu.solve(right)
        return solution


def rounding_floor(stiffness: csc_array, mass: csc_array) -> float:
    """Squared circular frequency below which a mode cannot be told from a rigid motion.

    At least that of 0.02 Hz; more where stiff short elements drown small stiffness in rounding.
    """
    ratio = (stiffness.diagonal() / mass.diagonal()).reshape(-1, 6)[:, :3]
    rounding = 10 * float(np.finfo(float).eps) * float(ratio.max())
    return max((2 * np.pi * 0.02) ** 2, rounding)
