"""Every single change worth trying, family by family, with its chance from the counts.

A family is one function from a ``Search`` to ``Candidate``s and a line in FAMILIES; a new kind of
fix is added here, in ``fixes`` and in ``push``.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.effort import pipe_mass_kg
from fieldkit.detune.excitation import Band, Goal
from fieldkit.detune.field import Field
from fieldkit.detune.fixes import (
    AddMass,
    AddSupport,
    Change,
    MoveMass,
    MoveSupport,
    SetMass,
    StiffenSupport,
)
from fieldkit.detune.push import EVERY_WAY, Push, own_springs, push_of, springs_along
from fieldkit.detune.scatter import Scatter
from fieldkit.detune.screen import Count, Counter, clear, counter, left_in
from fieldkit.progress import Progress
from fieldkit.span.layout import Span
from fieldkit.span.supports import KINDS, REFERENCE_DIAMETER_M

Array = NDArray[np.float64]

STIFFNESS_N_PER_M = (0.25e6, 64e6)
"""Brackets that can be built for a 4-inch pipe; scaled with the diameter."""
LEVELS = 60
AXIS_SETS = (("vertical",), ("lateral",), ("vertical", "lateral"), ("axial",))
MASS_SHARES = (0.03, 0.5)
"""Of the mass of the pipe itself."""
MASS_LEVELS = 40
KEPT_MASS_SHARES = (0.0, 0.15, 0.3, 0.45, 0.6, 0.75, 0.9, 1.1, 1.25, 1.5, 1.75, 2.0)
NEAR_SUPPORT_DIAMETERS = 2.0
NEAR_M = 1e-3
CHECKED_EVERY = 100
"""Candidates between two looks at whether the user wants to stop."""
STIFFER = 1.5
"""A support is stiffened to at least this many times what it is."""


@dataclass(frozen=True)
class Candidate:
    """A change with its counted chance."""

    change: Change
    chance: float
    left: float
    """Modes left in the bands, mean over the members: what a second change would have to cure."""


@dataclass(frozen=True)
class Search:
    """What the families search in."""

    span: Span
    field: Field
    bands: tuple[Band, ...]
    goal: Goal
    scatter: Scatter
    pick: NDArray[np.intp] | None = None
    """Members the choice is made on; None means all."""

    def counter(self, base: Field | None = None) -> Counter:
        """Counts on a base field at the edges of this job's bands."""
        return counter(base or self.field, self.bands, self.goal.up_to_hz)

    def push(self, change: Change) -> Push:
        """What a change does, as installed."""
        return push_of(self.field, change, self.scatter)

    def counted(self, change: Change) -> Candidate:
        """Any change of supports and masses with its chance."""
        return self.candidate(change, self.counter().with_push(self.push(change)))

    def candidate(self, change: Change, count: Count) -> Candidate:
        """A change with the counts (members, edges) after it."""
        kept = count if self.pick is None else count[self.pick]
        return Candidate(
            change, float(clear(kept).mean()), float(left_in(kept).sum(axis=-1).mean())
        )

    def candidates(self, changes: Sequence[Change], count: Count) -> list[Candidate]:
        """Many at once, from counts (changes, members, edges)."""
        kept = count if self.pick is None else count[:, self.pick]
        chance = clear(kept).mean(axis=1)
        left = left_in(kept).sum(axis=-1).mean(axis=1)
        return [
            Candidate(change, float(c), float(n))
            for change, c, n in zip(changes, chance, left, strict=True)
        ]

    def attachable(self) -> list[float]:
        """Grid stations outside every keep-out and not on top of a support."""
        near = NEAR_SUPPORT_DIAMETERS * self.span.pipe.outside_diameter_m
        taken = [support.at_m for support in self.span.supports]
        rounded = [round(float(station), 3) for station in self.field.station_m]
        return [
            station
            for station in rounded
            if station <= self.span.length_m
            and self.goal.may_attach(station)
            and all(abs(station - at) > near for at in taken)
        ]

    def stiffness_levels(self, count: int = LEVELS) -> Array:
        """(levels,) N/m for this pipe size, rounded to two digits."""
        scale = self.span.pipe.outside_diameter_m / REFERENCE_DIAMETER_M
        levels = scale * np.geomspace(*STIFFNESS_N_PER_M, count)
        return np.unique([float(f"{k:.1e}") for k in levels])

    def mass_levels(self, count: int = MASS_LEVELS) -> Array:
        """(levels,) kg for this pipe, rounded to two digits."""
        levels = pipe_mass_kg(self.span) * np.geomspace(*MASS_SHARES, count)
        return np.unique([round_mass(kg) for kg in levels])


def generate(search: Search, progress: Progress) -> list[Candidate]:
    """All candidates of the allowed families."""
    found: list[Candidate] = []
    allowed = [name for name in FAMILIES if name in search.goal.allow]
    for i, name in enumerate(allowed):
        progress.step(f"trying changes: {name}", i / max(1, len(allowed)))
        for candidate in FAMILIES[name](search):
            found.append(candidate)
            if len(found) % CHECKED_EVERY == 0:
                progress.step(f"trying changes: {name}", i / len(allowed))
    return found


def added_supports(search: Search) -> Iterable[Candidate]:
    """A new support at every free station, in each set of directions, at each stiffness."""
    levels, places = search.stiffness_levels(), search.attachable()
    for axes in AXIS_SETS:
        for stations, receptance in equal_rows(search, axes, places):
            count = search.counter()
            for level in levels:
                installed = level * search.scatter.stiffness_factor
                stated = stiffness_along(axes, level)
                changes = [AddSupport(at_m, **stated) for at_m in stations]
                yield from search.candidates(changes, count.with_springs(receptance, installed))


def stiffened_supports(search: Search) -> Iterable[Candidate]:
    """Each structural support brought to a higher total stiffness."""
    for index, support in enumerate(search.span.supports):
        if not KINDS[support.kind].structural:
            continue
        for axes in AXIS_SETS[:3]:
            numbers = [i for axis in axes for i in springs_along(search.field, index, axis)]
            if len(numbers) != len(axes):
                continue
            now = max(float(np.median(search.field.spring_value(i))) for i in numbers)
            changes = [
                StiffenSupport(index, **stiffness_along(axes, level))
                for level in search.stiffness_levels()
                if level > STIFFER * now
            ]
            yield from _pushed_at_one_place(search, changes)


def moved_supports(search: Search) -> Iterable[Candidate]:
    """Each support between the ends of the pipe, anywhere between its neighbours."""
    for index, support in enumerate(search.span.supports):
        low, high = _between_neighbours(search.span, index)
        if support.kind in ("anchor", "nozzle", "free") or low is None or high is None:
            continue
        own = own_springs(search.field, index)
        if not own:
            continue
        base = search.field.without(own, ())
        count = search.counter(base)
        changes = [MoveSupport(index, at_m) for at_m in search.attachable() if low < at_m < high]
        yield from _on_base(search, count, changes)


def changed_masses(search: Search) -> Iterable[Candidate]:
    """A mass clamped on anywhere; each existing mass made lighter or heavier, or moved."""
    yield from _added_masses(search)
    for index, mass in enumerate(search.span.masses):
        if mass.mass_kg <= 0:
            continue
        count = search.counter(search.field.without((), (index,)))
        changes: list[Change] = [
            SetMass(index, round_mass(share * mass.mass_kg)) for share in KEPT_MASS_SHARES
        ]
        changes += [MoveMass(index, station) for station in search.attachable()]
        yield from _on_base(search, count, changes)


Family = Callable[[Search], Iterable[Candidate]]
FAMILIES: dict[str, Family] = {
    "support": added_supports,
    "stiffen": stiffened_supports,
    "move": moved_supports,
    "mass": changed_masses,
}


def equal_rows(
    search: Search, axes: tuple[str, ...], places: Sequence[float]
) -> list[tuple[list[float], Array]]:
    """Stations with the principal receptances (stations, members, edges, p) of the rows there.

    Stations go together where as many rows belong to the directions.
    """
    spots = [search.field.spot(axes, at_m) for at_m in places]
    found = []
    for p in sorted({len(spot.rows) for spot in spots}):
        own = [i for i, spot in enumerate(spots) if len(spot.rows) == p]
        rows = np.stack([spots[i].rows for i in own])
        slope = np.stack([spots[i].slope for i in own])
        vector = search.field.modes.vector
        shape = rows[:, None] @ vector[None]
        shape += search.scatter.place_m[:, None, None] * (slope[:, None] @ vector[None])
        full = np.concatenate([spots[i].full for i in own])
        every = search.field.ports.residual_of(full).reshape(len(own), p, len(own), p)
        residual = every[np.arange(len(own)), :, np.arange(len(own))]
        residual += np.stack([spots[i].inside for i in own])
        receptance = search.counter().equal_rows(shape, residual)
        found.append(([places[i] for i in own], receptance))
    return found


def stiffness_along(axes: Sequence[str], level: float) -> dict[str, Any]:
    """Keyword arguments of a support change."""
    return {f"{axis}_n_per_m": float(level) for axis in axes}


def round_mass(kilograms: float) -> float:
    """To two digits."""
    return float(f"{kilograms:.2g}")


def _pushed_at_one_place(search: Search, changes: Sequence[Change]) -> Iterable[Candidate]:
    """Changes at the same rows: the receptance is formed once."""
    if not changes:
        return
    pushes = [search.push(change) for change in changes]
    count = search.counter()
    shape = pushes[0].rows @ search.field.modes.vector
    receptance = count.receptance(shape, pushes[0].residual)
    softness = np.stack([count.softness(push) for push in pushes])
    yield from search.candidates(changes, count.with_update(receptance[None], softness))


def _on_base(search: Search, count: Counter, changes: Sequence[Change]) -> Iterable[Candidate]:
    """Changes whose removals the base already has, those at as many rows together."""
    pushes = [(change, search.push(change)) for change in changes]
    for p in sorted({push.rows.shape[1] for _, push in pushes}):
        own = [(change, push) for change, push in pushes if push.rows.shape[1] == p]
        same = [change for change, _ in own]
        if p == 0:
            yield from search.candidates(same, np.stack([count.base] * len(own)))
            continue
        shape = np.stack([push.rows for _, push in own]) @ count.field.modes.vector
        receptance = count.receptance(shape, np.stack([push.residual for _, push in own]))
        softness = np.stack([count.softness(push) for _, push in own])
        yield from search.candidates(same, count.with_update(receptance, softness))


def _added_masses(search: Search) -> Iterable[Candidate]:
    count = search.counter()
    for stations, receptance in equal_rows(search, EVERY_WAY, search.attachable()):
        for kg in search.mass_levels():
            changes = [AddMass(at_m, float(kg)) for at_m in stations]
            mass = np.full(search.field.members, kg)
            yield from search.candidates(changes, count.with_masses(receptance, mass))


def _between_neighbours(span: Span, index: int) -> tuple[float | None, float | None]:
    """Stations of the supports before and after one; None where it is the first or last."""
    here = span.supports[index].at_m
    before = [s.at_m for s in span.supports if s.at_m < here - NEAR_M]
    after = [s.at_m for s in span.supports if s.at_m > here + NEAR_M]
    return max(before, default=None), min(after, default=None)
