"""Handbook frequency of a gap with bends between two holds: L, U, Z and three-dimensional."""

from __future__ import annotations

from itertools import pairwise

import numpy as np

from fieldkit.errors import Refusal
from fieldkit.span.bend_factors import BendFactor, Shape, bend_factor
from fieldkit.span.gap_formulas import (
    LOOSEST_GRIP,
    HandbookEstimate,
    pipe_data,
    stiff_enough,
    unit_hz,
)
from fieldkit.span.gaps import Gap, UniformPipe

LIGHT_MASS = 0.03
"""Point masses over the mass of the pipe that shift its frequency by at most about 4 %."""
MOST_UNEQUAL_LEGS = 1.5
NEARLY_SQUARE = 0.26
"""Cosine of 75 degrees."""


def bent(gap: Gap, pipe: UniformPipe, left_fixity: float, right_fixity: float) -> HandbookEstimate:
    """L, U, Z or 3-D gap held at both ends. Refusal where no factor is published or computed."""
    shape, ratio, unequal = _shape(gap)
    factor = bend_factor(shape, ratio)
    if factor is None:
        raise _no_formula(f"its outer legs are {ratio:.1f} times its middle leg")
    if gap.mass_kg > LIGHT_MASS * pipe.mass_kg_per_m * gap.length_m:
        raise _no_formula(f"it has bends and carries {gap.mass_kg:.0f} kg besides the pipe")
    _refuse_loose_ends(gap, pipe)
    grip = LOOSEST_GRIP + (1 - LOOSEST_GRIP) * (left_fixity + right_fixity) / 2
    fixed = factor.lowest * unit_hz(gap.length_m, pipe)
    share = "" if grip == 1 else f" x {grip:.2f} for how the ends grip"
    lengths = " + ".join(f"{np.linalg.norm(leg):.2f}" for leg in gap.legs)
    note = "bracket: 0.6 of fixed, as real clamps grip, to fixed; ends held in all directions"
    return HandbookEstimate(
        grip * fixed,
        LOOSEST_GRIP * fixed,
        fixed,
        f"f = F/(2 pi L^2) sqrt(EI/m), F = {factor.lowest:.2f}{share} "
        f"({_branch(shape, factor)}, legs {lengths} m); {pipe_data(gap.length_m, pipe)}",
        factor.source,
        f"{note}; {unequal}" if unequal else note,
    )


def _refuse_loose_ends(gap: Gap, pipe: UniformPipe) -> None:
    """The factors are those of ends held in all three directions."""
    wanted = stiff_enough(gap, pipe)
    for hold in (gap.left, gap.right):
        if hold is not None and hold.along_n_per_m < wanted:
            raise _no_formula(f"the {hold.place} lets the pipe of a bent span slide along itself")
        if hold is not None and hold.sideways_n_per_m < wanted:
            raise _no_formula(f"the {hold.place} lets the pipe of a bent span move sideways")


def _branch(shape: Shape, factor: BendFactor) -> str:
    if factor.in_plane is None:
        return f"{shape} span"
    in_plane = factor.in_plane < factor.out_of_plane
    return f"{shape} span, {'in' if in_plane else 'out of'} plane"


def _shape(gap: Gap) -> tuple[Shape, float, str]:
    """Shape, leg ratio, and a remark on legs that are not equal."""
    lengths = [float(np.linalg.norm(leg)) for leg in gap.legs]
    units = [leg / length for leg, length in zip(gap.legs, lengths, strict=True)]
    turns = [float(a @ b) for a, b in pairwise(units)]
    if max(map(abs, turns)) > NEARLY_SQUARE:
        raise _no_formula("it bends by another angle than 90 degrees")
    if len(gap.legs) == 2:
        return "L", min(lengths) / max(lengths), ""
    if len(gap.legs) > 3:
        raise _no_formula(f"it has {len(gap.legs) - 1} bends between two supports")
    first, middle, last = lengths
    unequal = max(first, last) / min(first, last)
    if unequal > MOST_UNEQUAL_LEGS:
        raise _no_formula(f"its outer legs differ by a factor of {unequal:.1f}")
    facing = float(units[0] @ units[2])
    shape: Shape = "U" if facing < -0.9 else "Z" if facing > 0.9 else "3-D"
    if shape == "3-D" and abs(facing) > NEARLY_SQUARE:
        raise _no_formula("its outer legs are neither parallel nor square to each other")
    remark = "outer legs unequal: factor of their mean, within 11 %" if unequal > 1.1 else ""
    return shape, (first + last) / 2 / middle, remark


def _no_formula(reason: str) -> Refusal:
    return Refusal(f"no handbook formula fits this span: {reason}", "go by the computed modes")
