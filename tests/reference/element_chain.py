"""A straight chain of the package's own elements along x, with nothing of the span model around it.

It lets the element matrices meet published answers of slender beams and of sections that are no
pipe: shear and rotary inertia are whatever the caller says.
"""

from __future__ import annotations

import math

import numpy as np

from fieldkit.span.elements import ElementSet, geometric_stiffness, mass, stiffness

UX, UY, UZ, RX, RY, RZ = range(6)
SLENDER = 1e30
"""Shear rigidity that leaves no shear."""


def chain(
    count: int,
    length_m: float,
    bending_n_m2: float,
    mass_kg_per_m: float,
    *,
    axial_n: float = 1.0,
    torsion_n_m2: float = 1.0,
    shear_n: float = SLENDER,
    rotary_kg_m: float = 0.0,
) -> ElementSet:
    """``count`` equal elements."""
    one = np.ones(count)
    return ElementSet(
        length_m=one * length_m / count,
        axes=np.broadcast_to(np.eye(3), (count, 3, 3)).copy(),
        offset_m=np.zeros((count, 3)),
        axial_rigidity_n=one * axial_n,
        bending_rigidity_n_m2=one * bending_n_m2,
        torsional_rigidity_n_m2=one * torsion_n_m2,
        shear_rigidity_n=one * shear_n,
        mass_kg_per_m=one * mass_kg_per_m,
        rotary_inertia_kg_m=one * rotary_kg_m,
    )


def joined(matrices: np.ndarray) -> np.ndarray:
    """Element matrices (E, 12, 12) added along the chain."""
    size = 6 * (len(matrices) + 1)
    whole = np.zeros((size, size))
    for i, matrix in enumerate(matrices):
        whole[6 * i : 6 * i + 12, 6 * i : 6 * i + 12] += matrix
    return whole


def matrices(elements: ElementSet, axial_force_n: float = 0.0) -> tuple[np.ndarray, np.ndarray]:
    """Stiffness and mass of the whole chain, all six motions a node."""
    force = np.full(len(elements.length_m), axial_force_n)
    k = joined(stiffness(elements) + geometric_stiffness(elements, force))
    return k, joined(mass(elements))


def kept(size: int, motions: tuple[int, ...], held: list[tuple[int, int]]) -> np.ndarray:
    """Which degrees of freedom remain: these motions, without (node, motion) that are held.

    A negative node counts from the end.
    """
    nodes = size // 6
    mask = np.zeros((nodes, 6), dtype=bool)
    mask[:, list(motions)] = True
    for node, motion in held:
        mask[node, motion] = False
    return mask.ravel()


def frequencies_hz(k: np.ndarray, m: np.ndarray, mask: np.ndarray, count: int) -> np.ndarray:
    """The lowest natural frequencies of what is kept; rigid motions must be held."""
    root = np.linalg.cholesky(k[np.ix_(mask, mask)])
    half = np.linalg.solve(root, m[np.ix_(mask, mask)])
    inverse = np.linalg.eigvalsh(np.linalg.solve(root, half.T))[::-1][:count]
    return 1 / np.sqrt(inverse) / (2 * math.pi)


def ends_held(ends: str) -> list[tuple[int, int]]:
    """Held (node, motion) of bending in the x-y plane for ends such as ``clamped-pinned``."""
    by_end = {"clamped": (UY, RZ), "pinned": (UY,), "free": ()}
    left, right = ends.split("-")
    return [(0, motion) for motion in by_end[left]] + [(-1, motion) for motion in by_end[right]]


def lambda_squared(count: int, ends: str, modes: int, tip_mass: float = 0.0) -> np.ndarray:
    """b^2 of a slender uniform beam by ``count`` elements, with a tip mass over the beam's."""
    k, m = matrices(chain(count, 1.0, 1.0, 1.0))
    m[6 * count + UY, 6 * count + UY] += tip_mass
    mask = kept(len(k), (UY, RZ), ends_held(ends))
    return 2 * math.pi * frequencies_hz(k, m, mask, modes)
