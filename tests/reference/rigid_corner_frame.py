"""Factors F of bent spans with sharp rigid corners: f = F/(2 pi L^2) sqrt(EI/m).

A slender frame of inextensible legs in dimensionless form, EI = m = L = 1, built apart from the
package: Hermite cubics for bending, one linear field for stretch and one for twist, corners rigid.
"""

from __future__ import annotations

import numpy as np

ELEMENTS_PER_LEG = 10
AXIAL_RATIO = 1e7
"""EA L^2/EI, so large that stretch does not show."""
MOTIONS = {"any": [1] * 6, "in": [1, 1, 0, 0, 0, 1], "out": [0, 0, 1, 1, 1, 0]}
X, Y, Z = np.eye(3)
SHAPES = {"L": (X, Y), "U": (X, Y, -X), "Z": (X, Y, X), "3-D": (X, Y, Z)}


def legs(shape: str, ratio: float) -> list[np.ndarray]:
    """Leg vectors of unit total length; ratio is outer leg over the other (L) or middle leg."""
    lengths = [ratio, 1.0] if shape == "L" else [ratio, 1.0, ratio]
    return [n * d / sum(lengths) for n, d in zip(lengths, SHAPES[shape], strict=True)]


def factors(
    leg_vectors: list[np.ndarray], motion: str = "any", poisson: float = 0.3, count: int = 6
) -> np.ndarray:
    """The lowest factors F between clamped ends, shape (count,).

    ``motion`` is any, or for legs in the xy plane: in (the plane) or out (of it).
    """
    nodes = [np.zeros(3)]
    elements = []
    for leg in leg_vectors:
        start = nodes[-1]
        for i in range(1, ELEMENTS_PER_LEG + 1):
            nodes.append(start + leg * i / ELEMENTS_PER_LEG)
            elements.append(leg)
    size = 6 * len(nodes)
    stiffness, mass = np.zeros((size, size)), np.zeros((size, size))
    for i, leg in enumerate(elements):
        k, m = _element(leg / ELEMENTS_PER_LEG, 1 / (1 + poisson))
        rows = slice(6 * i, 6 * i + 12)
        stiffness[rows, rows] += k
        mass[rows, rows] += m
    kept = np.tile(MOTIONS[motion], len(nodes)).astype(bool)
    kept[:6] = kept[-6:] = False
    k, m = stiffness[kept][:, kept], mass[kept][:, kept]
    root = np.linalg.inv(np.linalg.cholesky(k))
    inverse = np.linalg.eigvalsh(root @ m @ root.T)[::-1][:count]
    return 1 / np.sqrt(inverse)


def _element(vector, torsion):
    """Stiffness and mass (12, 12) of one element along ``vector``; EI = m = 1, GJ = ``torsion``."""
    h = float(np.linalg.norm(vector))
    along = vector / h
    across = np.linalg.svd(along[None, :])[2][1:]
    points, weights = np.polynomial.legendre.leggauss(4)
    stiffness, mass = np.zeros((12, 12)), np.zeros((12, 12))
    for s, weight in zip((points + 1) / 2, weights * h / 2, strict=True):
        stretch = np.kron([-1 / h, 1 / h], np.concatenate([along, np.zeros(3)]))
        twist = np.kron([-1 / h, 1 / h], np.concatenate([np.zeros(3), along]))
        carried = np.kron([1 - s, s], np.concatenate([along, np.zeros(3)]))
        stiffness += weight * (AXIAL_RATIO * np.outer(stretch, stretch))
        stiffness += weight * torsion * np.outer(twist, twist)
        mass += weight * np.outer(carried, carried)
        for direction in across:
            deflection, curvature = _bending(along, direction, h, s)
            stiffness += weight * np.outer(curvature, curvature)
            mass += weight * np.outer(deflection, deflection)
    return stiffness, mass


def _bending(along, direction, h, s):
    """Rows (12,) of deflection and curvature in one plane; slope is rotation cross along."""
    slope = np.cross(along, direction)
    cubic = (1 - 3 * s**2 + 2 * s**3, s - 2 * s**2 + s**3, 3 * s**2 - 2 * s**3, s**3 - s**2)
    second = (12 * s - 6, 6 * s - 4, 6 - 12 * s, 6 * s - 2)
    rows = []
    for w1, t1, w2, t2 in (cubic, np.array(second) / h**2):
        row = [w1 * direction, h * t1 * slope, w2 * direction, h * t2 * slope]
        rows.append(np.concatenate(row))
    return rows
