"""How far the wall of a header lets a branch rock.

ASME III NB-3687.5 (from memory): a moment M on a branch turns it by k M d / (E I) more than the
beam, d the outside diameter of the branch and I of its wall, with
    k = 0.1 (D/T)^1.5 sqrt((T/t) (d/D)) (t/T)   about the axis along the header,
    k = 0.2 (D/T)     sqrt((T/t) (d/D)) (t/T)   about the axis across it.
It is given for d/D up to 0.5 and D/T up to 100.
"""

from __future__ import annotations

import math

from fieldkit.errors import InputError
from fieldkit.span.pipes import PipeSection

SHELL_SD_LN = 0.8
"""Doubt of the stiffness: the two directions differ by up to a factor of three about their middle,
and a boss or a pad stiffens (common practice, no source)."""
MOST_BRANCH_SHARE = 0.5
MOST_SLENDER_WALL = 100.0


def shell_factors(header: PipeSection, branch: PipeSection) -> tuple[float, float]:
    """(k about the axis along the header, k about the axis across it)."""
    slender = header.outside_diameter_m / header.wall_m
    walls = branch.wall_m / header.wall_m
    share = branch.outside_diameter_m / header.outside_diameter_m
    common = math.sqrt(share / walls) * walls
    return 0.1 * slender**1.5 * common, 0.2 * slender * common


def shell_rotation_n_m_per_rad(
    header: PipeSection, branch: PipeSection, modulus_pa: float
) -> float:
    """Stiffness of a header's shell against a rocking branch, the geometric mean of its two
    directions."""
    along, across = shell_factors(header, branch)
    rigidity = modulus_pa * branch.second_moment_m4 / branch.outside_diameter_m
    return rigidity / math.sqrt(along * across)


def check_header(header: PipeSection, branch: PipeSection) -> None:
    """Raises InputError where the formula for the shell does not hold."""
    if branch.outside_diameter_m > MOST_BRANCH_SHARE * header.outside_diameter_m:
        raise InputError(
            "the branch is more than half as wide as its header",
            "leave header out: its rocking is then an unknown that the tap settles",
        )
    if header.outside_diameter_m > MOST_SLENDER_WALL * header.wall_m:
        raise InputError(
            "the header's wall is thinner than a hundredth of its diameter",
            "leave header out: its rocking is then an unknown that the tap settles",
        )
