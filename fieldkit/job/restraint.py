"""What a [[support]] says about directions, brought to one that holds each direction once.

On a riser *vertical* and *axial* are both z, and x, y, z may be given instead of the named
directions; a stiffness must not be counted twice.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import InputError, Place
from fieldkit.job.file_model import SupportTable
from fieldkit.span.layout import END_TOLERANCE_M, Span, Support, axis_vectors, is_vertical
from fieldkit.span.supports import KINDS

NAMED = ("vertical", "lateral", "axial")
GLOBAL = ("x", "y", "z")


def support_from(table: SupportTable, index: int, span: Span) -> Support:
    """The support of a table on a span (which need not hold it yet); raises InputError."""
    stiffness = {axis: getattr(table, axis) for axis in (*NAMED, "rotation", *GLOBAL)}
    support = Support(table.at, table.kind, **stiffness)
    if support.at_m > span.length_m + END_TOLERANCE_M:
        return support
    stated = [axis for axis in (*NAMED, *GLOBAL) if getattr(support, axis) != "implied"]
    tangent = span.centre_line.at(support.at_m)[1]
    if is_vertical(tangent):
        support = _on_riser(support, stated, index)
    if any(axis in GLOBAL for axis in stated):
        support = _in_place_of_named(support, stated, tangent, index)
    return support


def _on_riser(support: Support, stated: list[str], index: int) -> Support:
    """With z under the one name that this kind of support implies something for on a riser."""
    own, other = ("axial", "vertical") if KINDS[support.kind].grips_pipe else ("vertical", "axial")
    if other not in stated:
        return support
    if own in stated:
        what = "on a riser vertical and axial are the same direction"
        raise InputError(what, "give one of them", Place(field=f"support[{index}].{other}"))
    return replace(support, **{own: getattr(support, other), other: "implied"})


def _in_place_of_named(
    support: Support, stated: list[str], tangent: NDArray[np.float64], index: int
) -> Support:
    """With the named directions that the given x, y, z stand for set free."""
    given = [axis for axis in stated if axis in GLOBAL]
    held = np.concatenate([axis_vectors(tangent, axis) for axis in given])
    freed = {}
    for axis in NAMED:
        along = axis_vectors(tangent, axis) @ held.T
        if np.all(np.abs(along) < 1e-6):
            continue
        place = Place(field=f"support[{index}].{given[0]}")
        if axis in stated:
            what = f"{axis} and {' and '.join(given)} hold the same direction here"
            raise InputError(what, "give one of them", place)
        covered = np.allclose(np.sum(along**2, axis=1), 1.0, atol=1e-6)
        if not covered and getattr(KINDS[support.kind], axis) is not None:
            what = f"here {axis} is not held by {' and '.join(given)} alone"
            raise InputError(what, "give x, y and z, or vertical, lateral and axial", place)
        freed[axis] = 0.0
    return replace(support, **freed)  # type: ignore[arg-type]
