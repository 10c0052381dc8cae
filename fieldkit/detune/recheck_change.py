"""The change that leads from one description of a span to another."""

from __future__ import annotations

from collections.abc import Sequence

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
from fieldkit.errors import InputError
from fieldkit.span.layout import Span
from fieldkit.span.supports import springs

SAME_M = 1e-4
SAME_SHARE = 1e-4
STIFFENED = ("vertical", "lateral", "rotation")


def difference(before: Span, after: Span) -> Change:
    """Supports and masses that were added, moved, stiffened or changed.

    Raises InputError where nothing, or something else than that, differs.
    """
    _require_same_pipe(before, after)
    found = [
        *_of_supports(before, after),
        *_new_supports(before, after),
        *_of_masses(before, after),
        *(AddMass(m.at_m, m.mass_kg) for m in after.masses[len(before.masses) :]),
    ]
    if not found:
        raise InputError(
            "the two jobs describe the same supports and masses",
            "name the job as it was before the change, and the one with the change in it",
        )
    return found[0] if len(found) == 1 else AllOf(tuple(found))


def _require_same_pipe(before: Span, after: Span) -> None:
    if (before.pipe, before.material, before.legs) != (after.pipe, after.material, after.legs):
        raise InputError(
            "the two jobs describe different pipes",
            "name the job as it was before the change; pipe, material and legs must be the same",
        )
    fewer = [
        name
        for name in ("supports", "masses")
        if len(getattr(after, name)) < len(getattr(before, name))
    ]
    if fewer:
        raise InputError(
            f"the job after the change has fewer {' and '.join(fewer)} than before",
            "leave them in the file, a mass with 0 kg, a support with every direction free",
        )


def _of_supports(before: Span, after: Span) -> list[Change]:
    found: list[Change] = []
    for i, (old, new) in enumerate(zip(before.supports, after.supports, strict=False)):
        if abs(old.at_m - new.at_m) > SAME_M:
            found.append(MoveSupport(i, new.at_m))
        was, now = _stiffness(before, i), _stiffness(after, i)
        other = [
            axis for axis in STIFFENED if getattr(old, axis) != getattr(new, axis) and now.get(axis)
        ]
        if other and was != now:
            stated = {axis: now[axis] for axis in other}
            found.append(_stiffened(i, stated))
    return found


def _stiffened(index: int, stated: dict[str, float]) -> StiffenSupport:
    return StiffenSupport(
        index, stated.get("vertical"), stated.get("lateral"), stated.get("rotation")
    )


def _new_supports(before: Span, after: Span) -> Sequence[Change]:
    first = len(before.supports)
    return [
        _added(support.at_m, _stiffness(after, first + i))
        for i, support in enumerate(after.supports[first:])
    ]


def _added(at_m: float, held: dict[str, float]) -> AddSupport:
    return AddSupport(
        at_m, held.get("vertical"), held.get("lateral"), held.get("axial"), held.get("rotation")
    )


def _stiffness(span: Span, index: int) -> dict[str, float]:
    """Median by direction."""
    return {s.axis: s.stiffness for s in springs(span) if s.support == index}


def _of_masses(before: Span, after: Span) -> list[Change]:
    found: list[Change] = []
    for i, (old, new) in enumerate(zip(before.masses, after.masses, strict=False)):
        if abs(old.at_m - new.at_m) > SAME_M:
            found.append(MoveMass(i, new.at_m))
        if abs(old.mass_kg - new.mass_kg) > SAME_SHARE * max(old.mass_kg, new.mass_kg):
            found.append(SetMass(i, new.mass_kg))
    return found
