"""Level pipe on equal spans and equal springs: its frequencies against the spacing.

The ends of the line are held by the same springs; the pipe turns freely over all of them and slides
along, so that heat and pressure do not load it. Elements as in the rest of the span model.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fieldkit.span import elements as element
from fieldkit.span.layout import Span, State
from fieldkit.span.line import line_of

Array = NDArray[np.float64]

ELEMENTS = 6
"""A span: the frequencies of its first half-waves are then good to 1 in 10,000, of its third to
1 in 100."""
_PLANE = np.array([2, 4, 8, 10])
"""Deflection along z and rotation about y at both nodes of an element along x."""


def equal_span_hz(
    span: Span,
    state: State,
    spacing_m: Array,
    spans: int,
    stiffness_n_per_m: Array,
    *,
    elements: int = ELEMENTS,
) -> Array:
    """(S, modes) Hz, rising, in one plane for each spacing (S,) and support stiffness (S,).

    Pipe, contents and insulation of the span, in the state; masses and bends left out.
    """
    stiffness, mass = _assembled(span, state, spacing_m / elements, spans * elements)
    held = 2 * elements * np.arange(spans + 1)
    stiffness[:, held, held] += stiffness_n_per_m[:, None]
    half = np.linalg.inv(np.linalg.cholesky(mass))
    standard = half @ stiffness @ np.swapaxes(half, 1, 2)
    squared = np.linalg.eigvalsh(0.5 * (standard + np.swapaxes(standard, 1, 2)))
    return np.asarray(np.sqrt(np.maximum(squared, 0.0)) / (2 * np.pi))


def _assembled(span: Span, state: State, length_m: Array, count: int) -> tuple[Array, Array]:
    """Stiffness and mass (S, 2 (count + 1), 2 (count + 1)) of chains of equal elements."""
    line, each = line_of(span, state), np.ones(len(length_m))
    one = element.ElementSet(
        length_m=length_m,
        axes=np.tile(np.eye(3), (len(length_m), 1, 1)),
        offset_m=np.zeros((len(length_m), 3)),
        axial_rigidity_n=line.axial_n * each,
        bending_rigidity_n_m2=line.bending_n_m2 * each,
        torsional_rigidity_n_m2=line.torsion_n_m2 * each,
        shear_rigidity_n=line.shear_n * each,
        mass_kg_per_m=(line.own_mass_kg_per_m + state.nominal_fill * line.contents_kg_per_m) * each,
        rotary_inertia_kg_m=line.rotary_inertia_kg_m * each,
    )
    size = 2 * (count + 1)
    whole = np.zeros((2, len(length_m), size, size))
    for i, full in enumerate((element.stiffness(one), element.mass(one))):
        plane = full[:, _PLANE[:, None], _PLANE]
        for start in range(0, 2 * count, 2):
            whole[i, :, start : start + 4, start : start + 4] += plane
    return whole[0], whole[1]
