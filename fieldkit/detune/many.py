"""Many small symmetric eigenproblems at once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Index = NDArray[np.intp]


@dataclass(frozen=True)
class Modes:
    """Modes of many members in the coordinates of the basis."""

    eigenvalue: Array
    """(members, modes) rad^2/s^2, rising."""
    vector: Array
    """(members, r, modes) mass-normalised columns."""

    @property
    def frequency_hz(self) -> Array:
        """(members, modes)."""
        return np.sqrt(np.maximum(self.eigenvalue, 0.0)) / (2 * np.pi)


def solve_blocks(stiffness: Array, mass: Array, blocks: Sequence[Index]) -> Modes:
    """Solve many small pairs (members, r, r) that couple only within blocks of coordinates."""
    solved = [solve_many(stiffness[:, b][:, :, b], mass[:, b][:, :, b]) for b in blocks]
    return in_order(solved, blocks)


def in_order(solved: Sequence[Modes], blocks: Sequence[Index]) -> Modes:
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


def solve_many(stiffness: Array, mass: Array) -> Modes:
    """Solve many small symmetric pairs, both (members, r, r)."""
    lower = np.linalg.cholesky(mass)
    inverse = np.linalg.inv(lower)
    standard = inverse @ stiffness @ np.swapaxes(inverse, 1, 2)
    eigenvalue, vector = np.linalg.eigh(0.5 * (standard + np.swapaxes(standard, 1, 2)))
    return Modes(eigenvalue, np.swapaxes(inverse, 1, 2) @ vector)
