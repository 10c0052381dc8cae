"""Follow each mode from member to member, so that intervals belong to a mode and not to a rank."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Index = NDArray[np.intp]

FREQUENCY_WEIGHT = 6.0
"""What a factor e in frequency counts for against a turn from one direction into another."""
LEAST_HZ = 0.05


def follow(frequency_hz: Array, share: Array, reference_hz: Array, reference_share: Array) -> Index:
    """(members, count) which mode of each member continues each reference mode.

    ``frequency_hz`` is (members, m), ``share`` (members, m, directions) the share of each mode's
    motion in each direction; the references are (count,) and (count, directions). Shapes within a
    plane are left out on purpose: where two spans trade places shape jumps and frequency does not.
    Each mode is given away once (assignment problem: Kuhn 1955, Naval Research Logistics 2, 83).
    """
    from scipy.optimize import linear_sum_assignment

    turned = 1 - np.sum(np.minimum(share[:, :, None, :], reference_share[None, None, :, :]), axis=3)
    log_hz = np.log(np.maximum(frequency_hz, LEAST_HZ))
    log_reference = np.log(np.maximum(reference_hz, LEAST_HZ))
    cost = turned + FREQUENCY_WEIGHT * np.abs(log_hz[:, :, None] - log_reference[None, None, :])
    chosen = np.empty((len(cost), len(reference_hz)), dtype=np.intp)
    for s, member in enumerate(cost):
        rows, columns = linear_sum_assignment(member)
        chosen[s, columns] = rows
    return chosen


def followed(values: Array, chosen: Index) -> Array:
    """(members, count) values (members, m) of the followed modes."""
    return np.take_along_axis(values, chosen, axis=1)


def central_member(z: Array) -> int:
    """The member nearest the ensemble mean, in units of the ensemble's own spread."""
    spread = np.maximum(z.std(axis=0), 1e-6)
    return int(np.argmin(np.sum(((z - z.mean(axis=0)) / spread) ** 2, axis=1)))
