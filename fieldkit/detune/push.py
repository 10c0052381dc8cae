"""What a change does to the reduced model: springs and masses put on, some taken off.

Every change of support or mass, one or several together, becomes one ``Push``; counting, solving
and judging know nothing else of it. The scatter of installation is part of the push.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.field import Field, Spot
from fieldkit.detune.fixes import (
    AddMass,
    AddSupport,
    AllOf,
    Change,
    MoveMass,
    MoveSupport,
    SetMass,
    StiffenSupport,
)
from fieldkit.detune.scatter import Scatter

Array = NDArray[np.float64]

EVERY_WAY = ("x", "y", "z")
LEAST_ADDED = 1e-3
"""Of a bracket's stiffness: what stiffening adds to a support that is already stiffer."""
_STIFFNESS_OF = {
    "vertical": "vertical_n_per_m",
    "lateral": "lateral_n_per_m",
    "axial": "axial_n_per_m",
    "rotation": "rotation_n_m_per_rad",
}


@dataclass(frozen=True)
class Push:
    """Springs and masses at p rows of motion, on a base without some of its own."""

    rows: Array
    """(members, p, r) motion in the coordinates of the basis, off by the scatter of place."""
    residual: Array
    """(p, p) static flexibility that the basis, or the mesh between its nodes, cannot show."""
    stiffness: Array
    """(members, p); 0 at a row that only carries mass."""
    mass: Array
    """(members, p); 0 at a row that is only held."""
    full: Array
    """(p, 6N) the rows on the full model."""
    without_springs: tuple[int, ...] = ()
    without_masses: tuple[int, ...] = ()


def push_of(base: Field, change: Change, scatter: Scatter) -> Push:
    """The push of any change of supports and masses; other changes push nothing."""
    return joined(base, [_one(base, part, scatter.of(i)) for i, part in enumerate(parts(change))])


def parts(change: Change) -> tuple[Change, ...]:
    """The single changes a change is made of."""
    return change.parts if isinstance(change, AllOf) else (change,)


def held_axes(change: AddSupport | StiffenSupport) -> dict[str, float]:
    """Stiffness by direction, of the directions stated."""
    stated = {axis: getattr(change, key, None) for axis, key in _STIFFNESS_OF.items()}
    return {axis: float(value) for axis, value in stated.items() if value}


@dataclass(frozen=True)
class _Part:
    """One change: where it acts, with how much, and what it takes away."""

    spots: tuple[Spot, ...]
    rows: Array
    stiffness: Array
    mass: Array
    without_springs: tuple[int, ...] = ()
    without_masses: tuple[int, ...] = ()


def joined(base: Field, several: Sequence[_Part]) -> Push:
    """Several changes as one push."""
    none = np.zeros((0, len(base.model.basis)))
    full = np.concatenate([none, *(spot.full for part in several for spot in part.spots)])
    residual = base.ports.residual_of(full) if len(full) else np.zeros((0, 0))
    first = 0
    for spot in (spot for part in several for spot in part.spots):
        own = slice(first, first + len(spot.rows))
        residual[own, own] += spot.inside
        first = own.stop
    return Push(
        np.concatenate([p.rows for p in several], axis=1),
        residual,
        np.concatenate([p.stiffness for p in several], axis=1),
        np.concatenate([p.mass for p in several], axis=1),
        full,
        tuple(i for p in several for i in p.without_springs),
        tuple(i for p in several for i in p.without_masses),
    )


def _one(base: Field, change: Change, scatter: Scatter) -> _Part:
    if isinstance(change, AddSupport):
        return _added_support(base, change, scatter)
    if isinstance(change, StiffenSupport):
        return _stiffened(base, change, scatter)
    if isinstance(change, MoveSupport):
        return _moved_support(base, change, scatter)
    if isinstance(change, AddMass):
        spot = base.spot(EVERY_WAY, change.at_m)
        return _with_mass(base, spot, np.full(base.members, change.mass_kg), scatter)
    if isinstance(change, SetMass):
        return _reset_mass(base, change)
    if isinstance(change, MoveMass):
        spot = base.mass_spot(change.index, change.to_m)
        actual = base.mass_value(change.index)
        return _with_mass(base, spot, actual, scatter, (change.index,))
    return _part(base, (), np.zeros((base.members, 0)), np.zeros((base.members, 0)))


def _added_support(base: Field, change: AddSupport, scatter: Scatter) -> _Part:
    held = held_axes(change)
    spots = tuple(base.spot((axis,), change.at_m) for axis in held)
    columns = [np.full(len(s.rows), k) for s, k in zip(spots, held.values(), strict=True)]
    stiffness = scatter.stiffness_factor[:, None] * np.concatenate([np.zeros(0), *columns])
    return _part(base, spots, stiffness, np.zeros_like(stiffness), scatter)


def _stiffened(base: Field, change: StiffenSupport, scatter: Scatter) -> _Part:
    spots, added = [], [np.zeros((base.members, 0))]
    for axis, level in held_axes(change).items():
        for number in springs_along(base, change.index, axis):
            total = level * scatter.stiffness_factor
            more = np.maximum(total - base.spring_value(number), LEAST_ADDED * level)
            spot = base.spring_spot(number)
            spots.append(spot)
            added.append(np.repeat(more[:, None], len(spot.rows), axis=1))
    stiffness = np.concatenate(added, axis=1)
    return _part(base, tuple(spots), stiffness, np.zeros_like(stiffness))


def _moved_support(base: Field, change: MoveSupport, scatter: Scatter) -> _Part:
    own = own_springs(base, change.index)
    spots = tuple(base.spot((base.springs[i].axis,), change.to_m) for i in own)
    stiffness = np.concatenate(
        [
            np.zeros((base.members, 0)),
            *(
                np.repeat(base.spring_value(i)[:, None], len(spot.rows), axis=1)
                for i, spot in zip(own, spots, strict=True)
            ),
        ],
        axis=1,
    )
    return _part(base, spots, stiffness, np.zeros_like(stiffness), scatter, springs_off=own)


def _reset_mass(base: Field, change: SetMass) -> _Part:
    nominal = base.span.masses[change.index].mass_kg
    if change.mass_kg == 0:
        none = np.zeros((base.members, 0))
        return _part(base, (), none, none, masses_off=(change.index,))
    spot = base.mass_spot(change.index, base.span.masses[change.index].at_m)
    kept = (change.mass_kg / nominal) * base.mass_value(change.index)
    return _with_mass(base, spot, kept, None, (change.index,))


def _with_mass(
    base: Field,
    spot: Spot,
    kilograms: Array,
    scatter: Scatter | None,
    masses_off: tuple[int, ...] = (),
) -> _Part:
    mass = np.repeat(kilograms[:, None], len(spot.rows), axis=1)
    return _part(base, (spot,), np.zeros_like(mass), mass, scatter, masses_off=masses_off)


def _part(
    base: Field,
    spots: tuple[Spot, ...],
    stiffness: Array,
    mass: Array,
    scatter: Scatter | None = None,
    springs_off: tuple[int, ...] = (),
    masses_off: tuple[int, ...] = (),
) -> _Part:
    off = np.zeros(base.members) if scatter is None else scatter.place_m
    r = base.model.basis.shape[1]
    rows = [np.zeros((base.members, 0, r))]
    rows += [spot.rows + off[:, None, None] * spot.slope for spot in spots]
    return _Part(spots, np.concatenate(rows, axis=1), stiffness, mass, springs_off, masses_off)


def springs_along(base: Field, index: int, axis: str) -> list[int]:
    """Numbers of the springs of a support along an axis."""
    return [i for i in own_springs(base, index) if base.springs[i].axis == axis]


def own_springs(base: Field, index: int) -> tuple[int, ...]:
    """Numbers of all springs of a support."""
    return tuple(i for i, spring in enumerate(base.springs) if spring.support == index)


def removals(base: Field, push: Push) -> Push:
    """The same push with what it takes off written as springs and masses below zero."""
    rows, full = [push.rows], [push.full]
    stiffness, mass = [push.stiffness], [push.mass]
    off = [(base.spring_spot(i), base.spring_value(i), True) for i in push.without_springs]
    off += [
        (base.mass_spot(i, base.span.masses[i].at_m), base.mass_value(i), False)
        for i in push.without_masses
    ]
    for spot, value, is_spring in off:
        column = np.repeat(-value[:, None], len(spot.rows), axis=1)
        none = np.zeros_like(column)
        rows.append(np.broadcast_to(spot.rows, (base.members, *spot.rows.shape)))
        full.append(spot.full)
        stiffness.append(column if is_spring else none)
        mass.append(none if is_spring else column)
    p, size = push.rows.shape[1], sum(r.shape[1] for r in rows)
    residual = np.zeros((size, size))
    residual[:p, :p] = push.residual
    return Push(
        np.concatenate(rows, axis=1),
        residual,
        np.concatenate(stiffness, axis=1),
        np.concatenate(mass, axis=1),
        np.concatenate(full),
    )
