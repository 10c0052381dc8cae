"""A slender straight beam by scikit-fem's Hermite line element, a general-purpose library."""

from __future__ import annotations

import math
from collections.abc import Sequence
from itertools import pairwise

import numpy as np
from skfem import Basis, BilinearForm, ElementLineHermite, MeshLine
from skfem.helpers import dd, ddot

from tests.reference.dynamic_stiffness import Attachment, Beam


@BilinearForm
def _bending(u, v, _w):
    return ddot(dd(u), dd(v))


@BilinearForm
def _inertia(u, v, _w):
    return u * v


def natural_frequencies_hz(
    beam: Beam, length_m: float, attachments: Sequence[Attachment], count: int, fineness: int = 60
) -> np.ndarray:
    """The lowest frequencies (count,) of the beam with springs, holds and masses.

    Nodes at every attachment; ``fineness`` elements over the whole length.
    """
    stations = np.unique([0.0, length_m, *(a.at_m for a in attachments)])
    points = [0.0]
    for a, b in pairwise(stations):
        pieces = max(4, math.ceil(fineness * (b - a) / length_m))
        points += list(np.linspace(a, b, pieces + 1)[1:])
    mesh = MeshLine(np.array(points))
    basis = Basis(mesh, ElementLineHermite())
    k = beam.bending_n_m2 * _bending.assemble(basis).toarray()
    m = beam.mass_kg_per_m * _inertia.assemble(basis).toarray()
    kept = np.ones(len(k), dtype=bool)
    for attached in attachments:
        node = int(np.argmin(np.abs(mesh.p[0] - attached.at_m)))
        deflection, slope = basis.nodal_dofs[:, node]
        m[deflection, deflection] += attached.mass_kg
        for dof, stiffness in (
            (deflection, attached.spring_n_per_m),
            (slope, attached.rotation_n_m_per_rad),
        ):
            if math.isinf(stiffness):
                kept[dof] = False
            else:
                k[dof, dof] += stiffness
    return _lowest(k[kept][:, kept], m[kept][:, kept], count)


def _lowest(k, m, count):
    root = np.linalg.cholesky(k)
    half = np.linalg.solve(root, m)
    inverse = np.linalg.eigvalsh(np.linalg.solve(root, half.T))[::-1][:count]
    return 1 / np.sqrt(inverse) / (2 * math.pi)
