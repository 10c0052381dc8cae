"""What a mesh cannot show between its nodes: how a point of an element gives way by itself.

The elements are exact for loads at their nodes; under a force inside one, the point moves further
than the interpolated nodes do, by the deflection of the element held at both ends.
"""

from __future__ import annotations

from dataclasses import fields

import numpy as np
from numpy.typing import NDArray

from fieldkit.span.elements import ElementSet, stiffness
from fieldkit.span.structure import Structure

Array = NDArray[np.float64]

AT_A_NODE = 1e-6
"""Share of an element's length."""


def inside_flexibility(structure: Structure, at_m: float) -> Array:
    """(6, 6) motion of a station per force and moment there, nodes held, in x, y, z."""
    last = len(structure.station_m) - 2
    index = int(np.clip(np.searchsorted(structure.station_m, at_m) - 1, 0, last))
    start, end = structure.station_m[index : index + 2]
    share = float(np.clip((at_m - start) / (end - start), 0.0, 1.0))
    if share < AT_A_NODE or share > 1 - AT_A_NODE:
        return np.zeros((6, 6))
    before = stiffness(_piece(structure.elements, index, share))[0, 6:, 6:]
    behind = stiffness(_piece(structure.elements, index, 1 - share))[0, :6, :6]
    return np.asarray(np.linalg.inv(before + behind))


def _piece(elements: ElementSet, index: int, share: float) -> ElementSet:
    """A share of one element, as an element on its own line."""
    own = {
        field.name: getattr(elements, field.name)[index : index + 1] for field in fields(elements)
    }
    own["length_m"] = own["length_m"] * share
    own["offset_m"] = np.zeros_like(own["offset_m"])
    return ElementSet(**own)
