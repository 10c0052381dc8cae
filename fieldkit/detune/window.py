"""How stiff a support must be drawn, and how stiff it may be, for the wanted chance."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.excitation import Band, Goal
from fieldkit.detune.field import Field
from fieldkit.detune.fixes import AddSupport, AllOf, Change, StiffenSupport
from fieldkit.detune.push import Push, parts, push_of, removals
from fieldkit.detune.scatter import Scatter
from fieldkit.detune.screen import clear, counter

Array = NDArray[np.float64]

AXES = ("vertical", "lateral", "axial")
SHARES = np.geomspace(1 / 30, 30, 69)
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
    def kept_as_drawn(self) -> bool:
        """Whether the drawn stiffness keeps the wanted chance."""
        return bool(self._kept[self.drawn])

    @property
    def fails_below(self) -> float | None:
        """Least share from which on the chance is kept up to the drawn stiffness; None where the
        drawn stiffness does not keep it, 0 where any stiffness does."""
        if not self.kept_as_drawn:
            return None
        lost = np.flatnonzero(~self._kept[: self.drawn])
        return float(self.share[lost[-1] + 1]) if len(lost) else 0.0

    @property
    def fails_above(self) -> float | None:
        """Largest share up to which the chance is kept; None where it is at the drawn stiffness
        already lost, or where no stiffness is too much."""
        if not self.kept_as_drawn:
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
    number: int,
    bands: Sequence[Band],
    goal: Goal,
    scatter: Scatter,
) -> StiffnessWindow | None:
    """Chance over a range of stiffnesses of one part of a change, the other parts as drawn.

    None where that part states no stiffness, or turns with the pipe as well.
    """
    part = parts(change)[number]
    if not stated_stiffness(part) or getattr(part, "rotation_n_m_per_rad", None):
        return None
    count = counter(base, bands, goal.up_to_hz)
    drawn = removals(base, push_of(base, change, scatter))
    receptance = count.receptance(drawn.rows @ base.modes.vector, drawn.residual)
    levels = _levels(base, change, number, scatter, drawn)
    softness = np.stack([count.softness(replace(drawn, stiffness=k)) for k in levels])
    chance = clear(count.with_update(receptance, softness)).mean(axis=-1)
    return StiffnessWindow(SHARES, np.asarray(chance), goal.chance)


def _levels(base: Field, change: Change, number: int, scatter: Scatter, drawn: Push) -> list[Array]:
    """Stiffness (members, p) of every row at each share; that of a new support is in proportion."""

    def at(share: float) -> Array:
        return removals(base, push_of(base, scaled(change, share, number), scatter)).stiffness

    if isinstance(parts(change)[number], AddSupport):
        more = at(2.0) - drawn.stiffness
        return [drawn.stiffness + (share - 1) * more for share in SHARES]
    return [at(float(share)) for share in SHARES]


def scaled(change: Change, share: float, number: int | None = None) -> Change:
    """The change with the stiffness stated by one part, or by all, multiplied."""
    several = [
        _one_scaled(part, share) if number in (None, i) else part
        for i, part in enumerate(parts(change))
    ]
    return several[0] if len(several) == 1 else AllOf(tuple(several))


def _one_scaled(part: Change, share: float) -> Change:
    stated = {f"{axis}_n_per_m": share * k for axis, k in stated_stiffness(part).items()}
    return replace(part, **stated) if stated else part  # type: ignore[type-var]
