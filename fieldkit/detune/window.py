"""How stiff a support must be drawn, and how stiff it may be, for the wanted chance."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.excitation import Band, Goal
from fieldkit.detune.field import Field
from fieldkit.detune.fixes import AddSupport, Change, StiffenSupport
from fieldkit.detune.screen import merged, negative_count
from fieldkit.span.layout import axis_vectors
from fieldkit.span.supports import springs

Array = NDArray[np.float64]

STEP_M = 0.02
AXES = ("vertical", "lateral", "axial")
SHARES = np.geomspace(1 / 50, 50, 81)
"""Of the drawn stiffness, 10 % apart; the middle one is the drawn stiffness."""


@dataclass(frozen=True)
class StiffnessWindow:
    """Chance against stiffness, all directions of the support in proportion."""

    share: Array
    """(levels,) of the drawn stiffness, rising."""
    chance: Array
    """(levels,) that every band is clear, as-installed scatter included."""
    wanted: float

    @property
    def drawn(self) -> int:
        """Number of the level that is the drawn stiffness."""
        return int(np.argmin(np.abs(np.log(self.share))))

    @property
    def fails_below(self) -> float | None:
        """Least share from which on the chance is kept up to the drawn stiffness; None where the
        drawn stiffness does not keep it, 0 where any stiffness does."""
        if not self._kept[self.drawn]:
            return None
        lost = np.flatnonzero(~self._kept[: self.drawn])
        return float(self.share[lost[-1] + 1]) if len(lost) else 0.0

    @property
    def fails_above(self) -> float | None:
        """Largest share up to which the chance is kept; None where it is at the drawn stiffness
        already lost, or where no stiffness is too much."""
        if not self._kept[self.drawn]:
            return None
        lost = np.flatnonzero(~self._kept[self.drawn :])
        return float(self.share[self.drawn + lost[0] - 1]) if len(lost) else None

    @property
    def _kept(self) -> NDArray[np.bool_]:
        return np.asarray(self.chance >= self.wanted)


def stated_stiffness(change: Change) -> dict[str, float]:
    """N/m by direction that a support of this change must have; empty where it has none."""
    if not isinstance(change, AddSupport | StiffenSupport):
        return {}
    stated = {axis: getattr(change, f"{axis}_n_per_m", None) for axis in AXES}
    return {axis: float(value) for axis, value in stated.items() if value}


def stiffness_window(
    base: Field,
    change: Change,
    bands: Sequence[Band],
    goal: Goal,
    stiffness_factor: Array,
    place_m: Array,
) -> StiffnessWindow | None:
    """Chance over a range of stiffnesses; None where the change states none.

    ``stiffness_factor`` and ``place_m`` (members,) are the scatter of installation.
    """
    stated = stated_stiffness(change)
    if not stated or getattr(change, "rotation_n_m_per_rad", None):
        return None
    levels = SHARES[:, None, None] * stiffness_factor[None, :, None]
    if isinstance(change, StiffenSupport):
        found = _stiffened(base, change, stated, levels)
    else:
        found = _added(base, change.at_m, stated, levels, place_m)  # type: ignore[attr-defined]
    if found is None:
        return None
    return StiffnessWindow(SHARES, _chance(base, bands, goal.up_to_hz, *found), goal.chance)


def _chance(
    base: Field, bands: Sequence[Band], up_to_hz: float, shape: Array, residual: Array, k: Array
) -> Array:
    """(levels,) share of members with no mode in any interval, from the counts at its edges."""
    edges = np.array([edge for interval in merged(bands, up_to_hz) for edge in interval])
    gap = base.modes.eigenvalue[:, None, :] - (2 * np.pi * edges)[None, :, None] ** 2
    receptance = (shape[:, None] / gap[:, :, None, :]) @ np.swapaxes(shape, 1, 2)[:, None]
    softness = (1 / k)[:, :, None, :, None] * np.eye(k.shape[-1])
    count = (gap < 0).sum(axis=2) - negative_count(receptance[None] + residual + softness)
    clear = np.all(count[..., 1::2] == count[..., 0::2], axis=-1)
    return np.asarray(clear.mean(axis=1))


Springs = tuple[Array, Array, Array]
"""Shapes (members, p, r), residual flexibility (p, p), stiffness (levels, members, p)."""


def _added(
    base: Field, at_m: float, stated: Mapping[str, float], levels: Array, place_m: Array
) -> Springs:
    """A new support, each member off by its own scatter of place."""
    structure, basis = base.model.structure, base.model.basis
    here = [structure.motion_rows(at_m, axis) for axis in stated]
    drawn = np.repeat(list(stated.values()), [len(rows) for rows in here])
    tangent = base.span.centre_line.at(at_m)[1]
    vectors = np.concatenate([axis_vectors(tangent, axis) for axis in stated])
    low, high = max(at_m - STEP_M, 0.0), min(at_m + STEP_M, base.span.length_m)
    before, after = (structure.station_motion(station)[0] for station in (low, high))
    slope = vectors @ (after - before) / (high - low)
    moved = np.concatenate(here) @ basis + place_m[:, None, None] * (slope @ basis)
    station = int(np.argmin(np.abs(base.station_m - at_m)))
    ports = [int(port) for axis in stated for port in base.ports.of(axis, station)]
    residual = np.zeros((len(drawn), len(drawn)))
    if len(ports) == len(drawn):
        residual = base.ports.residual[np.ix_(ports, ports)]
    return np.asarray(moved @ base.modes.vector), residual, levels * drawn


def _stiffened(
    base: Field, change: StiffenSupport, stated: Mapping[str, float], levels: Array
) -> Springs | None:
    """An existing support brought to a new total; what is stiffer already stays as it is."""
    numbers = {s.axis: i for i, s in enumerate(springs(base.span)) if s.support == change.index}
    if any(axis not in numbers for axis in stated):
        return None
    held = [(port, k, base.spring_value(numbers[axis])) for axis, k in stated.items()
            for port in base.ports.of("spring", numbers[axis])]  # fmt: skip
    ports = [int(port) for port, _, _ in held]
    drawn, now = np.array([k for _, k, _ in held]), np.stack([k for _, _, k in held], axis=1)
    added = np.maximum(levels * drawn - now, 1e-3 * drawn)
    return base.motion(ports), base.ports.residual[np.ix_(ports, ports)], added
