"""Every change worth trying, family by family, with its chance from the counts.

A family is one function from a ``Search`` to ``Candidate``s and a line in FAMILIES; a new kind of
fix is added here and in ``fixes``.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace
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
from fieldkit.detune.screen import Counter, Scatter, counter
from fieldkit.progress import Progress
from fieldkit.span.layout import Span
from fieldkit.span.supports import KINDS, REFERENCE_DIAMETER_M, springs

Array = NDArray[np.float64]

STIFFNESS_LEVELS_N_PER_M = (0.5e6, 1e6, 2e6, 4e6, 8e6, 16e6, 32e6)
"""Brackets that can be built for a 4-inch pipe; scaled with the diameter."""
AXIS_SETS = (("vertical",), ("lateral",), ("vertical", "lateral"))
MASS_SHARES = (0.05, 0.1, 0.2, 0.35, 0.5)
"""Of the mass of the pipe itself."""
KEPT_MASS_SHARES = (0.0, 0.3, 0.6, 1.5)
NEAR_SUPPORT_DIAMETERS = 2.0
NEAR_M = 1e-3


@dataclass(frozen=True)
class Push:
    """What a candidate does to a base field: springs or masses at ports."""

    without_springs: tuple[int, ...] = ()
    without_masses: tuple[int, ...] = ()
    ports: tuple[int, ...] = ()
    moved_by: Array | None = None
    """(members, p, r) shapes at the ports after the scatter of place; None where it has none."""
    stiffness: Array | None = None
    """(members, p)."""
    mass: Array | None = None


@dataclass(frozen=True)
class Candidate:
    """A change with what it does to the model and its counted chance."""

    change: Change
    push: Push
    chance: float


@dataclass(frozen=True)
class Search:
    """What the families search in."""

    span: Span
    field: Field
    bands: tuple[Band, ...]
    goal: Goal
    scatter: Scatter

    def counter(self, base: Field) -> Counter:
        """Counts on a base field at the edges of this job's bands."""
        return counter(base, self.bands, self.goal.up_to_hz)

    def attachable(self) -> list[int]:
        """Grid stations outside every keep-out and not on top of a support."""
        near = NEAR_SUPPORT_DIAMETERS * self.span.pipe.outside_diameter_m
        taken = [support.at_m for support in self.span.supports]
        return [
            i
            for i, station in enumerate(self.field.station_m)
            if self.goal.may_attach(float(station))
            and all(abs(station - at) > near for at in taken)
        ]

    def stiffness_levels(self) -> Array:
        """(levels,) N/m for this pipe size, rounded to two digits."""
        scale = self.span.pipe.outside_diameter_m / REFERENCE_DIAMETER_M
        return np.array([float(f"{scale * k:.1e}") for k in STIFFNESS_LEVELS_N_PER_M])


def generate(search: Search, progress: Progress) -> list[Candidate]:
    """All candidates of the allowed families."""
    found: list[Candidate] = []
    allowed = [name for name in FAMILIES if name in search.goal.allow]
    for i, name in enumerate(allowed):
        progress.step(f"trying changes: {name}", i / max(1, len(allowed)))
        found.extend(FAMILIES[name](search))
    return found


def added_supports(search: Search) -> Iterable[Candidate]:
    """A new support at every free station, in each set of directions, at each stiffness."""
    count = search.counter(search.field)
    levels = search.stiffness_levels()
    for station in search.attachable():
        at_m = round(float(search.field.station_m[station]), 3)
        for axes in AXIS_SETS:
            ports = _ports(search.field, axes, station)
            shape = _displaced(search, search.field, axes, station)
            receptance = count.receptance(shape, _residual(search.field, ports))
            stiffness = _scattered(search, levels, len(ports))
            clear = count.clear_with_springs(receptance, stiffness)
            for level, k, chance in zip(levels, stiffness, clear.mean(axis=1), strict=True):
                change = replace(AddSupport(at_m), **_levels(axes, level))
                push = Push(ports=ports, moved_by=shape, stiffness=k)
                yield Candidate(change, push, float(chance))


def stiffened_supports(search: Search) -> Iterable[Candidate]:
    """Each structural support brought to a higher total stiffness."""
    count = search.counter(search.field)
    for index, support in enumerate(search.span.supports):
        if not KINDS[support.kind].structural:
            continue
        for axes in AXIS_SETS:
            numbers = _springs_along(search, index, axes)
            if len(numbers) == len(axes):
                yield from _stiffened(search, count, index, axes, numbers)


def moved_supports(search: Search) -> Iterable[Candidate]:
    """Each support between the ends of the pipe, anywhere between its neighbours."""
    for index, support in enumerate(search.span.supports):
        low, high = _between_neighbours(search.span, index)
        if support.kind in ("anchor", "nozzle", "free") or low is None or high is None:
            continue
        own = [i for i, s in enumerate(springs(search.span)) if s.support == index]
        if not own:
            continue
        base = search.field.without(own, ())
        count = search.counter(base)
        axes = tuple(springs(search.span)[i].axis for i in own)
        value = [search.field.spring_value(i) for i in own]
        for station in search.attachable():
            if not low < base.station_m[station] < high:
                continue
            ports = _ports(base, axes, station)
            shape = _displaced(search, base, axes, station)
            stiffness = _per_port(base, axes, station, value)
            receptance = count.receptance(shape, _residual(base, ports))
            chance = count.clear_with_springs(receptance, stiffness[None]).mean()
            push = Push(tuple(own), (), ports, shape, stiffness=stiffness)
            change = MoveSupport(index, round(float(base.station_m[station]), 3))
            yield Candidate(change, push, float(chance))


def changed_masses(search: Search) -> Iterable[Candidate]:
    """A mass clamped on anywhere; each existing mass made lighter or heavier, or moved."""
    yield from _added_masses(search)
    for index, mass in enumerate(search.span.masses):
        if mass.mass_kg <= 0:
            continue
        base = search.field.without((), (index,))
        yield from _reset_mass(search, base, index)
        yield from _moved_mass(search, base, index)


Family = Callable[[Search], Iterable[Candidate]]
FAMILIES: dict[str, Family] = {
    "support": added_supports,
    "stiffen": stiffened_supports,
    "move": moved_supports,
    "mass": changed_masses,
}


def _stiffened(
    search: Search, count: Counter, index: int, axes: tuple[str, ...], numbers: list[int]
) -> Iterable[Candidate]:
    ports = tuple(int(p) for i in numbers for p in search.field.ports.of("spring", i))
    owner = [j for j, i in enumerate(numbers) for _ in search.field.ports.of("spring", i)]
    now = np.stack([search.field.spring_value(numbers[j]) for j in owner], axis=1)
    shape = search.field.motion(ports)
    receptance = count.receptance(shape, _residual(search.field, ports))
    levels = [k for k in search.stiffness_levels() if k > 1.5 * np.median(now)]
    for level in levels:
        total = level * search.scatter.stiffness_factor[:, None]
        added = np.maximum(total - now, 1e-3 * level)
        chance = count.clear_with_springs(receptance, added[None]).mean()
        change = replace(StiffenSupport(index), **_levels(axes, level))
        yield Candidate(change, Push(ports=ports, stiffness=added), float(chance))


def _levels(axes: tuple[str, ...], level: float) -> dict[str, Any]:
    return {f"{axis}_n_per_m": float(level) for axis in axes}


def _springs_along(search: Search, index: int, axes: tuple[str, ...]) -> list[int]:
    wanted: list[int] = []
    for axis in axes:
        wanted += [
            i
            for i, spring in enumerate(springs(search.span))
            if spring.support == index and spring.axis == axis
        ]
    return wanted


def _added_masses(search: Search) -> Iterable[Candidate]:
    count = search.counter(search.field)
    kilograms = [_round_mass(share * pipe_mass_kg(search.span)) for share in MASS_SHARES]
    for station in search.attachable():
        ports = _ports(search.field, _EVERY_WAY, station)
        shape = _displaced(search, search.field, _EVERY_WAY, station)
        receptance = count.receptance(shape, _residual(search.field, ports))
        mass = np.array(kilograms)[:, None, None] * np.ones((1, search.field.members, len(ports)))
        clear = count.clear_with_masses(receptance, mass).mean(axis=1)
        at_m = round(float(search.field.station_m[station]), 3)
        for kg, values, chance in zip(kilograms, mass, clear, strict=True):
            push = Push(ports=ports, moved_by=shape, mass=values)
            yield Candidate(AddMass(at_m, kg), push, float(chance))


def _reset_mass(search: Search, base: Field, index: int) -> Iterable[Candidate]:
    count = search.counter(base)
    ports = tuple(int(p) for p in base.ports.of("mass", index))
    receptance = count.receptance(base.motion(ports), _residual(base, ports))
    actual = search.field.mass_value(index)
    for share in KEPT_MASS_SHARES:
        kept = _round_mass(share * search.span.masses[index].mass_kg)
        if share == 0.0:
            clear, push = count.clear_now(), Push(without_masses=(index,))
        else:
            ratio = kept / search.span.masses[index].mass_kg
            values = (ratio * actual)[:, None] * np.ones((1, len(ports)))
            clear = count.clear_with_masses(receptance, values[None])
            push = Push(without_masses=(index,), ports=ports, mass=values)
        yield Candidate(SetMass(index, kept), push, float(clear.mean()))


def _moved_mass(search: Search, base: Field, index: int) -> Iterable[Candidate]:
    count = search.counter(base)
    actual = search.field.mass_value(index)
    model, mass = base.model, search.span.masses[index]
    for station in search.attachable():
        at_m = float(base.station_m[station])
        rows = model.structure.point_rows(at_m, mass.offset_m) @ model.basis
        shape = rows @ base.modes.vector
        values = actual[:, None] * np.ones((1, len(rows)))
        receptance = count.receptance(shape, np.zeros((len(rows), len(rows))))
        chance = count.clear_with_masses(receptance, values[None]).mean()
        push = Push(without_masses=(index,), moved_by=shape, mass=values)
        yield Candidate(MoveMass(index, round(at_m, 3)), push, float(chance))


_EVERY_WAY = ("x", "y", "z")


def _between_neighbours(span: Span, index: int) -> tuple[float | None, float | None]:
    """Stations of the supports before and after one; None where it is the first or last."""
    here = span.supports[index].at_m
    before = [s.at_m for s in span.supports if s.at_m < here - NEAR_M]
    after = [s.at_m for s in span.supports if s.at_m > here + NEAR_M]
    return max(before, default=None), min(after, default=None)


def _ports(base: Field, axes: tuple[str, ...], station: int) -> tuple[int, ...]:
    return tuple(int(p) for axis in axes for p in base.ports.of(axis, station))


def _per_port(base: Field, axes: tuple[str, ...], station: int, value: list[Array]) -> Array:
    """(members, p) a stiffness per axis, repeated where an axis means two rows."""
    columns = [v for axis, v in zip(axes, value, strict=True) for _ in base.ports.of(axis, station)]
    return np.stack(columns, axis=1)


def _displaced(search: Search, base: Field, axes: tuple[str, ...], station: int) -> Array:
    """(members, p, r) shapes at a station, each member off by its own scatter of place."""
    last = len(base.station_m) - 1
    low, high = max(station - 1, 0), min(station + 1, last)
    here = base.motion(_ports(base, axes, station))
    before, after = _ports(base, axes, low), _ports(base, axes, high)
    if len(before) != here.shape[1] or len(after) != here.shape[1]:
        return here
    slope = (base.motion(after) - base.motion(before)) / (
        base.station_m[high] - base.station_m[low]
    )
    return np.asarray(here + search.scatter.place_m[:, None, None] * slope)


def _residual(base: Field, ports: tuple[int, ...]) -> Array:
    return base.ports.residual[np.ix_(ports, ports)]


def _scattered(search: Search, levels: Array, ports: int) -> Array:
    """(levels, members, p)."""
    factor = search.scatter.stiffness_factor[None, :, None]
    return levels[:, None, None] * factor * np.ones((1, 1, ports))


def _round_mass(kilograms: float) -> float:
    return float(f"{kilograms:.2g}")
