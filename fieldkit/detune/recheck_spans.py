"""A change as it may really stand: the span before and after, and what nobody knows of either.

Both spans are cut into the same stretches, so that one unknown length means the same pipe in both;
what the change brings (its stiffness in each direction, its place, its mass) are unknowns of their
own. How likely each way of being installed is, is common practice, no source.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.effort import pipe_mass_kg
from fieldkit.detune.fixes import (
    AddMass,
    AddSupport,
    Change,
    MoveMass,
    MoveSupport,
    SetMass,
    StiffenSupport,
)
from fieldkit.detune.push import parts
from fieldkit.detune.scatter import PLACE_SCATTER_M, STIFFNESS_SCATTER_LN
from fieldkit.span.layout import Believed, PointMass, Span, Support
from fieldkit.span.structure import segments
from fieldkit.span.supports import springs

Array = NDArray[np.float64]

AS_DRAWN, STIFFNESS, NOTHING = "as drawn", "stiffness", "nothing"
LOOSE, PLACE, MASS, OTHER = "loose", "place", "mass", "other"
PRIOR = {
    AS_DRAWN: 0.55,
    STIFFNESS: 0.2,
    NOTHING: 0.05,
    LOOSE: 0.05,
    PLACE: 0.05,
    MASS: 0.05,
    OTHER: 0.05,
}
"""How often a change turns out so, before it is tapped (common practice, no source)."""
OFTEN_SOFTER = (0.45, 1.0)
"""Median of stiffness as found over as drawn and sd of its ln, where it is not as drawn: what a
bracket stands on is the usual culprit (common practice, no source)."""
PLACE_OFF_M = 0.25
MASS_OFF = 0.5
RIDING_SHARE, RIDING_SD = 0.1, 0.8
"""Clamp and bracket that ride on the pipe: share of the pipe's own mass, and its relative sd."""
ADDED_MASS_TOLERANCE = 0.02
MOST_SHIFT = 0.25
"""Share of the shorter stretch beside it: a place is not doubted further, the model being linear in
it."""
EVEN = 3**0.5
"""Half-width over standard deviation of an even doubt."""
TURNS = ("rotation", "torsion")
SAME_M = 1e-6

Held = tuple[int, str]
"""Number of a support and a direction."""


@dataclass(frozen=True)
class Installed:
    """The span after a change, as one way of being installed has it."""

    name: str
    after: Span
    """With every stiffness stated as believed; supports and masses numbered as the change does."""
    own_springs: Mapping[Held, float] = field(default_factory=dict)
    """What the change states for them, N/m or N m/rad; their stiffness is not that of before."""
    own_masses: frozenset[int] = frozenset()
    places: Mapping[float, float] = field(default_factory=dict)
    """How far in metres the change may stand from where it was drawn, by its station."""


def ways(change: Change) -> tuple[str, ...]:
    """The ways a change may be installed that differ from each other."""
    kinds = [type(part) for part in parts(change)]
    found = [AS_DRAWN]
    if any(kind in (AddSupport, StiffenSupport, MoveSupport) for kind in kinds):
        found.append(STIFFNESS)
    if any(kind in _PLACED for kind in kinds):
        found.append(PLACE)
    if any(kind in (*_PLACED, StiffenSupport, SetMass) for kind in kinds):
        found += [MASS, NOTHING]
    if any(kind in (MoveSupport, StiffenSupport) for kind in kinds):
        found.append(LOOSE)
    return tuple(found)


_PLACED = (AddSupport, MoveSupport, AddMass, MoveMass)


def pinned(span: Span) -> Span:
    """The span with what its kinds of support imply written out, so that moving one keeps it."""
    stated: list[dict[str, Believed]] = [{} for _ in span.supports]
    for spring in springs(span):
        stated[spring.support][spring.axis] = Believed(spring.stiffness, spring.sd_ln)
    supports = tuple(
        replace(support, **axes)  # type: ignore[arg-type]
        for support, axes in zip(span.supports, stated, strict=True)
    )
    return replace(span, supports=supports)


def marked(span: Span, stations: Sequence[float]) -> Span:
    """The span cut at these stations too; what cuts it holds nothing."""
    cuts = {end for stretch in segments(span) for end in stretch}
    new = [s for s in stations if min(abs(s - cut) for cut in cuts) > SAME_M]
    free = tuple(Support(station, "free") for station in sorted(set(new)))
    return replace(span, supports=(*span.supports, *free))


def stations_of(change: Change, span: Span) -> tuple[float, ...]:
    """Every station a change acts at, old ones too."""
    found: list[float] = []
    for part in parts(change):
        if isinstance(part, AddSupport | AddMass):
            found.append(part.at_m)
        elif isinstance(part, MoveSupport):
            found += [span.supports[part.index].at_m, part.to_m]
        elif isinstance(part, MoveMass):
            found += [span.masses[part.index].at_m, part.to_m]
    return tuple(found)


def installed(
    span: Span, change: Change, name: str, believed: Mapping[Held, Believed]
) -> Installed:
    """A change made to a pinned span; ``believed`` is what the supports are worth by the taps."""
    if name == NOTHING:
        return Installed(name, span)
    found = Installed(name, span)
    for part in parts(change):
        found = _made(found, part, span, believed)
    return replace(found, places=_places(found, change, span))


def _made(
    found: Installed, part: Change, before: Span, believed: Mapping[Held, Believed]
) -> Installed:
    if isinstance(part, AddSupport):
        return _with_riding(_added(found, part), part.at_m, before)
    if isinstance(part, StiffenSupport):
        at_m = before.supports[part.index].at_m
        return _with_riding(_stiffened(found, part), at_m, before)
    if isinstance(part, MoveSupport):
        return _with_riding(_moved(found, part, believed), part.to_m, before)
    if isinstance(part, AddMass):
        tolerance = MASS_OFF if found.name == MASS else ADDED_MASS_TOLERANCE
        return _with_mass(found, PointMass(part.at_m, part.mass_kg, "added mass", tolerance))
    if isinstance(part, SetMass | MoveMass):
        return _remade_mass(replace(found, after=part.apply(found.after)), part.index)
    return found


def _own(found: Installed, drawn: float, doubt: float = STIFFNESS_SCATTER_LN) -> Believed | float:
    """A stiffness of the change as this way of installing it has it."""
    if found.name == LOOSE:
        return 0.0
    if found.name == STIFFNESS:
        factor, spread = OFTEN_SOFTER
        return Believed(factor * drawn, float(np.hypot(spread, doubt)))
    return Believed(drawn, doubt)


def _added(found: Installed, part: AddSupport) -> Installed:
    stated = {
        "vertical": part.vertical_n_per_m,
        "lateral": part.lateral_n_per_m,
        "axial": part.axial_n_per_m,
        "rotation": part.rotation_n_m_per_rad,
    }
    number = len(found.after.supports)
    held = {axis: value for axis, value in stated.items() if value}
    axes = {axis: _own(found, value) if value else 0.0 for axis, value in stated.items()}
    support = Support(part.at_m, "guide", torsion=0.0, **axes)  # type: ignore[arg-type]
    after = replace(found.after, supports=(*found.after.supports, support))
    return _with_own(replace(found, after=after), number, held)


def _stiffened(found: Installed, part: StiffenSupport) -> Installed:
    stated = {
        "vertical": part.vertical_n_per_m,
        "lateral": part.lateral_n_per_m,
        "rotation": part.rotation_n_m_per_rad,
    }
    held = {axis: value for axis, value in stated.items() if value}
    axes = {axis: _own(found, value) for axis, value in held.items()}
    return _with_own(_held(found, part.index, axes), part.index, held)


def _moved(found: Installed, part: MoveSupport, believed: Mapping[Held, Believed]) -> Installed:
    """The springs go along; where they may have changed they are unknowns of their own."""
    after = part.apply(found.after)
    found = replace(found, after=after)
    if found.name not in (STIFFNESS, LOOSE):
        return found
    own = {
        axis: b
        for (support, axis), b in believed.items()
        if support == part.index and axis not in TURNS
    }
    axes = {axis: _own(found, b.median, b.sd_ln) for axis, b in own.items()}
    return _with_own(
        _held(found, part.index, axes), part.index, {axis: b.median for axis, b in own.items()}
    )


def _held(found: Installed, index: int, axes: Mapping[str, Believed | float]) -> Installed:
    supports = list(found.after.supports)
    supports[index] = replace(supports[index], **axes)  # type: ignore[arg-type]
    return replace(found, after=replace(found.after, supports=tuple(supports)))


def _with_own(found: Installed, index: int, held: Mapping[str, float]) -> Installed:
    if found.name == LOOSE:
        return found
    own = dict(found.own_springs) | {(index, axis): value for axis, value in held.items()}
    return replace(found, own_springs=own)


def _with_riding(found: Installed, at_m: float, before: Span) -> Installed:
    """With the mass of clamp and bracket, where that is what is in doubt."""
    if found.name != MASS:
        return found
    riding = RIDING_SHARE * pipe_mass_kg(before)
    return _with_mass(found, PointMass(at_m, riding, "clamp and bracket", RIDING_SD))


def _with_mass(found: Installed, mass: PointMass) -> Installed:
    number = len(found.after.masses)
    after = replace(found.after, masses=(*found.after.masses, mass))
    return replace(found, after=after, own_masses=found.own_masses | {number})


def _remade_mass(found: Installed, index: int) -> Installed:
    if found.name != MASS:
        return found
    masses = list(found.after.masses)
    masses[index] = replace(masses[index], tolerance=MASS_OFF)
    after = replace(found.after, masses=tuple(masses))
    return replace(found, after=after, own_masses=found.own_masses | {index})


def _places(found: Installed, change: Change, before: Span) -> dict[float, float]:
    """How far off each part may stand that has a place inside the span."""
    cuts = segments(marked(found.after, stations_of(change, before)))
    off_m = PLACE_OFF_M if found.name == PLACE else EVEN * PLACE_SCATTER_M
    places = {}
    for part in parts(change):
        at_m = getattr(part, "at_m", getattr(part, "to_m", None))
        beside = [
            b - a
            for a, b in cuts
            if at_m is not None and min(abs(a - at_m), abs(b - at_m)) < SAME_M
        ]
        if at_m is not None and len(beside) == 2:
            places[float(at_m)] = min(off_m, MOST_SHIFT * min(beside))
    return places
