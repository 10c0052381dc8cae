"""Frequency factors of spans with bends, both ends fixed: f = F / (2 pi L^2) sqrt(EI / m).

L is the sum of the legs, corner to corner. For equal legs the factors are those of J. C. Wachel,
S. J. Morton and K. E. Atkins, Piping Vibration Analysis, Proc. 19th Turbomachinery Symposium,
1990, pp. 119-134, quoted from memory. For other legs the factors are computed for slender legs of
a material with a Poisson ratio of 0.3, rigid corners and no stretch. Elbows change the lowest
factor of equal legs by up to 8 % (Z, with elbows of flexibility 6.6), most others by less than 4 %.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np

Shape = Literal["L", "U", "Z", "3-D"]

PUBLISHED_SOURCE = (
    "Wachel, Morton & Atkins, Piping Vibration Analysis, Proc. 19th Turbomachinery Symposium, "
    "1990, pp. 119-134 (from memory)"
)
COMPUTED_SOURCE = (
    "computed from slender beam theory, rigid corners, Poisson ratio 0.3; at equal legs the "
    "lowest factor is within 6 % of Wachel, Morton & Atkins 1990 (from memory)"
)
EQUAL_LEGS = (0.9, 1.1)
LARGEST_RATIO = 3.0


@dataclass(frozen=True)
class BendFactor:
    """Factors F of the first mode in each plane; a 3-D span has but one."""

    out_of_plane: float
    in_plane: float | None
    source: str

    @property
    def lowest(self) -> float:
        """Factor of the first mode of all."""
        return min(self.out_of_plane, self.in_plane or self.out_of_plane)


PUBLISHED_EQUAL_LEGS: dict[Shape, BendFactor] = {
    "L": BendFactor(16.5, 59.4, PUBLISHED_SOURCE),
    "U": BendFactor(18.7, 23.7, PUBLISHED_SOURCE),
    "Z": BendFactor(23.4, 22.4, PUBLISHED_SOURCE),
    "3-D": BendFactor(20.6, None, PUBLISHED_SOURCE),
}

LEG_RATIOS = (
    0.0, 0.02, 0.05, 0.10, 0.15, 0.20, 0.25, 0.30, 0.35, 0.40, 0.50, 0.60, 0.75, 0.90, 1.0,
    1.25, 1.50, 2.0, 2.5, 3.0,
)  # fmt: skip
"""Shorter over longer leg of an L, outer over middle leg of the others; at 0 a span is straight."""

OUT_OF_PLANE: dict[Shape, tuple[float, ...]] = {
    "L": (
        22.37, 22.23, 22.36, 22.98, 23.71, 24.26, 24.40, 24.03, 23.19, 22.12, 20.02, 18.46,
        17.08, 16.50, 16.41,
    ),
    "U": (
        22.37, 22.09, 22.30, 23.33, 24.54, 25.47, 25.91, 25.81, 25.31, 24.58, 22.93, 21.46,
        19.77, 18.59, 17.99, 16.93, 16.25, 15.47, 15.05, 14.79,
    ),
    "Z": (
        22.37, 22.09, 22.30, 23.37, 24.71, 25.93, 26.84, 27.36, 27.52, 27.41, 26.74, 25.92,
        24.84, 24.05, 23.65, 22.98, 22.58, 22.20, 22.06, 22.01,
    ),
    "3-D": (
        22.37, 22.31, 22.71, 24.01, 25.50, 26.78, 27.59, 27.82, 27.53, 26.90, 25.29, 23.76,
        21.97, 20.72, 20.09, 19.01, 18.34, 17.60, 17.22, 17.00,
    ),
}  # fmt: skip

IN_PLANE: dict[Shape, tuple[float, ...]] = {
    "L": (
        22.37, 23.03, 24.09, 25.90, 27.79, 29.76, 31.81, 33.93, 36.13, 38.39, 43.08, 47.90,
        54.98, 60.43, 61.67,
    ),
    "U": (
        22.37, 23.71, 25.83, 29.51, 33.40, 37.49, 41.78, 46.27, 43.87, 40.85, 36.68, 33.97,
        31.35, 29.66, 28.84, 27.41, 26.49, 25.38, 24.74, 24.32,
    ),
    "Z": (
        22.37, 22.52, 23.13, 24.70, 26.51, 28.20, 29.49, 30.19, 30.28, 29.94, 28.75, 27.55,
        26.15, 25.18, 24.71, 23.92, 23.44, 22.95, 22.72, 22.59,
    ),
}  # fmt: skip


def bend_factor(shape: Shape, leg_ratio: float) -> BendFactor | None:
    """Factors of a bent span, None where ``leg_ratio`` is outside the table (0 to 3).

    ``leg_ratio`` is leg over leg for an L (either way round), outer over middle leg for U, Z and
    3-D, whose two outer legs are taken as equal.
    """
    if shape == "L" and leg_ratio > 1:
        leg_ratio = 1 / leg_ratio
    if EQUAL_LEGS[0] <= leg_ratio <= EQUAL_LEGS[1]:
        return PUBLISHED_EQUAL_LEGS[shape]
    if not 0 <= leg_ratio <= LARGEST_RATIO:
        return None
    in_plane = _interpolated(IN_PLANE[shape], leg_ratio) if shape in IN_PLANE else None
    return BendFactor(_interpolated(OUT_OF_PLANE[shape], leg_ratio), in_plane, COMPUTED_SOURCE)


def _interpolated(column: tuple[float, ...], leg_ratio: float) -> float:
    return float(np.interp(leg_ratio, LEG_RATIOS[: len(column)], column))
