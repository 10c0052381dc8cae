"""Where modes move and where they stand still: nodes, antinodes, and the place to tap."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.span.modes import Mode

Array = NDArray[np.float64]

LEAST_ANTINODE = 0.3
"""Of the largest motion: a lower hump is no place to look at."""
NEAR_SHARE = 0.02
"""Of the length: a node this close to a support is the support's own."""
SHOWS = 0.2
"""Of its largest motion: from here on a tap shows a mode well (common practice, no source)."""


@dataclass(frozen=True)
class TapPlace:
    """A station to tap at, with the sensor beside it."""

    at_m: float
    share: float
    """Least motion there of any mode looked at, of that mode's largest."""
    weakest: int
    """The mode that moves least there, from 1."""
    modes: int
    """How many were looked at."""

    @property
    def shows_all(self) -> bool:
        """Whether every mode moves enough there."""
        return self.share >= SHOWS


def tap_place(
    modes: Sequence[Mode], keep_out_m: Sequence[tuple[float, float]] = ()
) -> TapPlace | None:
    """The station where the mode that moves least moves most; None without modes or place.

    The shapes are read on the stations of the first mode. Stretches of ``keep_out_m`` are left out.
    """
    if not modes:
        return None
    stations = np.unique(modes[0].station_m)
    free = np.ones(len(stations), dtype=bool)
    for low, high in keep_out_m:
        free &= (stations < low) | (stations > high)
    if not free.any():
        return None
    motion = np.stack([_motion(mode, stations)[1] for mode in modes])
    least = np.where(free, motion.min(axis=0), -1.0)
    best = int(np.argmax(least))
    weakest = int(np.argmin(motion[:, best])) + 1
    return TapPlace(float(stations[best]), float(least[best]), weakest, len(modes))


def nodes(mode: Mode, supports_m: Sequence[float] = ()) -> tuple[float, ...]:
    """Stations between the supports where the motion passes through zero and turns round."""
    stations, size, shape = _motion(mode)
    found = []
    for i in range(len(stations) - 1):
        turned = float(shape[i] @ shape[i + 1])
        if turned < 0:
            share = size[i] / (size[i] + size[i + 1])
            found.append(float(stations[i] + share * (stations[i + 1] - stations[i])))
        elif i > 0 and size[i] < 1e-9 and float(shape[i - 1] @ shape[i + 1]) < 0:
            found.append(float(stations[i]))
    near = NEAR_SHARE * float(stations[-1] - stations[0])
    return tuple(at for at in found if all(abs(at - support) > near for support in supports_m))


def antinodes(mode: Mode) -> tuple[float, ...]:
    """Stations where the motion is largest between its nodes, the largest of all first."""
    stations, size, _ = _motion(mode)
    padded = np.concatenate([[-1.0], size, [-1.0]])
    peaks = np.flatnonzero(
        (padded[1:-1] > padded[:-2]) & (padded[1:-1] >= padded[2:]) & (size >= LEAST_ANTINODE)
    )
    order = peaks[np.argsort(-size[peaks], kind="stable")]
    return tuple(float(stations[i]) for i in order)


def _motion(mode: Mode, at_m: Array | None = None) -> tuple[Array, Array, Array]:
    """Stations (n,), size of the motion (n,) with 1 the largest, and displacement (n, 3)."""
    order = np.argsort(mode.station_m, kind="stable")
    known, first = np.unique(mode.station_m[order], return_index=True)
    shape = mode.shape[order][first]
    stations = known if at_m is None else at_m
    moved = np.column_stack([np.interp(stations, known, shape[:, axis]) for axis in range(3)])
    size = np.linalg.norm(moved, axis=1)
    largest = float(np.linalg.norm(shape, axis=1).max(initial=0.0))
    return stations, size / largest if largest > 0 else size, moved
