"""How far what is built differs from what was drawn."""

from __future__ import annotations

from dataclasses import dataclass, replace
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

STIFFNESS_SCATTER_LN = 0.35
"""A bracket comes out this much stiffer or softer than drawn (common practice, no source)."""
PLACE_SCATTER_M = 0.015
JUDGING_SEED = 21
"""Of the brackets that a chosen change is judged with: the same wherever its stiffness is told."""
SHIFT = 37
"""Members by which the scatter of each further part is shifted: it is built on its own."""


@dataclass(frozen=True)
class Scatter:
    """How one member's bracket differs from the drawing."""

    stiffness_factor: Array
    """(members,)"""
    place_m: Array
    """(members,)"""
    as_drawn: int | None = None
    """A member installed exactly as drawn, so that it can be re-solved in full."""

    def of(self, part: int) -> Scatter:
        """The scatter of the nth part of a change."""
        if part == 0:
            return self
        factor = np.roll(self.stiffness_factor, SHIFT * part)
        place = np.roll(self.place_m, SHIFT * part)
        shifted = replace(self, stiffness_factor=factor, place_m=place)
        return shifted if self.as_drawn is None else shifted.exact(self.as_drawn)

    def exact(self, member: int) -> Scatter:
        """The same with one member as drawn."""
        factor, place = self.stiffness_factor.copy(), self.place_m.copy()
        factor[member], place[member] = 1.0, 0.0
        return Scatter(factor, place, member)


def as_installed(members: int, rng: np.random.Generator) -> Scatter:
    """Draw the scatter of installation once for all candidates, so that they compare fairly."""
    return Scatter(
        np.exp(STIFFNESS_SCATTER_LN * _even_normals(members, rng)),
        PLACE_SCATTER_M * _even_normals(members, rng),
    )


def _even_normals(count: int, rng: np.random.Generator) -> Array:
    """Standard normal numbers in random order, spread as evenly as so few can be.

    Two hundred plain draws may lack a tenth of the spread, the same for every job.
    """
    share = (np.arange(count) + 0.5) / count
    normal = np.array([NormalDist().inv_cdf(p) for p in share.tolist()])
    return np.asarray(rng.permutation(normal))
