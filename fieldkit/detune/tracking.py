"""Follow each mode from member to member, so that intervals belong to a mode and not to a rank."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Index = NDArray[np.intp]

RANK_WEIGHT = 1e-3
"""Breaks ties between members' modes of equal likeness in favour of the same rank."""


def follow(vector: Array, reference: Array) -> Index:
    """(members, count) which mode of each member is most like each reference mode.

    ``vector`` is (members, r, m) mass-normalised in a basis that is mass-orthonormal at the
    reference; ``reference`` is (r, count). Likeness is the squared inner product (modal assurance,
    Allemang and Brown 1982, from memory); each mode is given away once.
    """
    from scipy.optimize import linear_sum_assignment

    likeness = (np.swapaxes(vector, 1, 2) @ reference) ** 2
    members, modes, count = likeness.shape
    rank = np.abs(np.arange(modes)[:, None] - np.arange(count)[None, :])
    cost = -likeness + RANK_WEIGHT * rank
    chosen = np.empty((members, count), dtype=np.intp)
    for s in range(members):
        rows, columns = linear_sum_assignment(cost[s])
        chosen[s, columns] = rows
    return chosen


def followed(values: Array, chosen: Index) -> Array:
    """(members, count) values (members, m) of the followed modes."""
    return np.take_along_axis(values, chosen, axis=1)


def central_member(z: Array) -> int:
    """The member nearest the ensemble mean, in units of the ensemble's own spread."""
    spread = np.maximum(z.std(axis=0), 1e-6)
    return int(np.argmin(np.sum(((z - z.mean(axis=0)) / spread) ** 2, axis=1)))
