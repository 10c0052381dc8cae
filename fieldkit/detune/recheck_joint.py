"""The unknowns of a span before and after a change together, and the models that read them.

Every value a model needs is a sum of joint values: a stretch after the change is the same stretch
as before, a mass made half as heavy is half the old one, and a place that is off by so many metres
lengthens one stretch and shortens the next.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.recheck_spans import SAME_M, Held, Installed, marked
from fieldkit.detune.reduced import ReducedModel
from fieldkit.detune.unknowns import LENGTH_SD, Unknown, unknowns_of
from fieldkit.span.layout import Believed, Span, State
from fieldkit.span.structure import segments
from fieldkit.span.supports import springs

Array = NDArray[np.float64]

Key = tuple[object, ...]
"""What an unknown is, whatever its number in one span or the other."""


@dataclass(frozen=True)
class Joint:
    """Unknowns of both spans, those of before first, then what the change brought."""

    unknowns: tuple[Unknown, ...]
    keys: tuple[Key, ...]
    before: Array
    """(joint, unknowns of the span before) share of each joint value in the model's values."""
    after: Array
    """(joint, unknowns of the span after)."""
    before_span: Span
    """Cut as the span after."""
    after_span: Span
    brought: int
    """Joint unknowns from this number on are the change's own."""

    @property
    def own(self) -> NDArray[np.intp]:
        """Numbers of what the change brought."""
        return np.arange(self.brought, len(self.unknowns))


def joint_of(
    span: Span, found: Installed, stations: Sequence[float], states: Sequence[State]
) -> Joint:
    """The unknowns of a pinned span and of one way a change to it is installed."""
    before, after = marked(span, stations), marked(found.after, stations)
    old, new = unknowns_of(before, states), unknowns_of(after, states)
    old_keys = [key_of(before, unknown) for unknown in old]
    new_keys = [_after_key(found, after, unknown) for unknown in new]
    own = [i for i, key in enumerate(new_keys) if key not in old_keys]
    places = [_place(station, most_m) for station, most_m in found.places.items()]
    keys = [*old_keys, *(new_keys[i] for i in own), *(("place", s) for s in found.places)]
    unknowns = (*old, *(new[i] for i in own), *places)
    column = {key: j for j, key in enumerate(keys)}
    to_old, to_new = np.zeros((len(keys), len(old))), np.zeros((len(keys), len(new)))
    to_old[range(len(old)), range(len(old))] = 1.0
    for i, (unknown, key) in enumerate(zip(new, new_keys, strict=True)):
        to_new[column[key], i] = _share(unknown, unknowns[column[key]])
    for station in found.places:
        to_new[column[("place", station)]] = _shifted(after, new, station)
    return Joint(unknowns, tuple(keys), to_old, to_new, before, after, len(old))


def key_of(span: Span, unknown: Unknown) -> Key:
    """A spring by its support and direction, anything else by its number and state."""
    if unknown.role == "spring":
        spring = springs(span)[unknown.index]
        return "spring", spring.support, spring.axis
    return unknown.role, unknown.index, unknown.state


def _after_key(found: Installed, after: Span, unknown: Unknown) -> Key:
    key = key_of(after, unknown)
    own = key[0] == "spring" and (key[1], key[2]) in found.own_springs
    own |= key[0] == "mass" and key[1] in found.own_masses
    return ("own", *key) if own else key


def _place(station: float, most_m: float) -> Unknown:
    """Even over a range, as a fill is, so that no draw lies past the next support."""
    return Unknown(f"place of the change at {station:g} m", "m", "fill", 0, 1.0, most_m)


def _share(unknown: Unknown, joint: Unknown) -> float:
    """A mass that was changed keeps its relative doubt."""
    return unknown.centre / joint.centre if unknown.role == "mass" else 1.0


def _shifted(after: Span, unknowns: Sequence[Unknown], station: float) -> Array:
    """(unknowns,) relative length of each stretch per metre the change stands further on."""
    shift = np.zeros(len(unknowns))
    cuts = segments(after)
    for i, unknown in enumerate(unknowns):
        if unknown.role == "length":
            a, b = cuts[unknown.index]
            shift[i] = (abs(b - station) < SAME_M) / (b - a) - (abs(a - station) < SAME_M) / (b - a)
    return shift


def embedded(model: ReducedModel, shares: Array, joint: Joint) -> ReducedModel:
    """A model that reads joint values; ``shares`` is (joint, unknowns of the model)."""
    ports = {
        j: model.port_rows[int(i)]
        for j in range(len(shares))
        for i in np.flatnonzero(shares[j])
        if int(i) in model.port_rows and shares[j, i] == 1.0
    }
    return replace(
        model,
        unknowns=joint.unknowns,
        stiffness_terms=np.tensordot(shares, model.stiffness_terms, 1),
        mass_terms=np.tensordot(shares, model.mass_terms, 1),
        reference=np.array([_reference(unknown) for unknown in joint.unknowns]),
        port_rows=ports,
    )


def _reference(unknown: Unknown) -> float:
    if unknown.role == "fill":
        return unknown.centre
    return 0.0 if unknown.role in ("spring", "mass") else 1.0


def lifted(joint: Joint, span: Span, unknowns: Sequence[Unknown], z: Array, own: Array) -> Array:
    """(members, joint) members of the span before the change, with draws for all that is new.

    ``z`` is (members, unknowns of the span) and ``own`` (members, joint) standard normal numbers; a
    part of a stretch has its whole's.
    """
    column = {key_of(span, unknown): i for i, unknown in enumerate(unknowns)}
    whole, cuts = segments(span), segments(joint.before_span)
    found = own.copy()
    for j, key in enumerate(joint.keys[: joint.brought]):
        if key[0] == "length":
            a, b = cuts[joint.unknowns[j].index]
            middle = 0.5 * (a + b)
            inside = next(i for i, (low, high) in enumerate(whole) if low <= middle <= high)
            key = ("length", inside, "")
        if key in column:
            found[:, j] = z[:, column[key]]
    return found


def lowered(joint: Joint, found: Installed, unknowns: Sequence[Unknown], z: Array) -> Array:
    """(members, unknowns) of the span after the change alone, from joint members."""
    column = {key: j for j, key in enumerate(joint.keys)}
    made = np.zeros((len(z), len(unknowns)))
    for i, unknown in enumerate(unknowns):
        if unknown.role == "length":
            made[:, i] = _stretch(joint, segments(found.after)[unknown.index], z)
        else:
            made[:, i] = z[:, column[_after_key(found, found.after, unknown)]]
    return made


def _stretch(joint: Joint, stretch: tuple[float, float], z: Array) -> Array:
    """(members,) standard normal number of a stretch from the parts it was cut into."""
    start, end = stretch
    longer_m = np.zeros(len(z))
    for j, (key, unknown) in enumerate(zip(joint.keys, joint.unknowns, strict=True)):
        value = unknown.at(z[:, j]) - 1.0
        if key[0] == "length":
            a, b = segments(joint.after_span)[unknown.index]
            longer_m += value * (b - a) * (start - SAME_M < a and b < end + SAME_M)
        elif key[0] == "place":
            at_m = float(str(key[1]))
            longer_m += value * ((abs(end - at_m) < SAME_M) - float(abs(start - at_m) < SAME_M))
    return longer_m / (end - start) / LENGTH_SD


def believed(span: Span, unknowns: Sequence[Unknown], z: Array) -> Mapping[Held, Believed]:
    """What the members (members, unknowns) say of each spring of a span; stated ones as stated."""
    stated = {(s.support, s.axis): Believed(s.stiffness, s.sd_ln) for s in springs(span)}
    for i, unknown in enumerate(unknowns):
        if unknown.role == "spring":
            _, support, axis = key_of(span, unknown)
            ln = np.log(unknown.at(z[:, i]))
            found = Believed(float(np.exp(np.median(ln))), float(ln.std()))
            stated[(int(str(support)), str(axis))] = found
    return stated
