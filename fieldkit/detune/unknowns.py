"""What nobody knows exactly about a span, each as a standard normal number.

The doubts besides the support stiffnesses (which stand in ``span.supports``) are common practice,
no source, except the mill tolerance: ASME B36.10M allows a wall up to 12.5 % below nominal (from
memory); with the doubt below one pipe in a hundred is thinner than that.

| what | doubt, one standard deviation | why |
|---|---|---|
| length of each stretch | 1 % | taped past insulation and flanges; each on its own, since leaving |
| | | that out made intervals too narrow |
| modulus | 1 % | scatter of steel at a known temperature |
| wall, by schedule | 0.96 to 1.00 of nominal | mill tolerance, to one side |
| wall, in millimetres | 3 % | gauged at a few places, through paint |
| mass | as the job says | catalogues differ by a tenth |
| fill, where a range | even over it | nobody looked |
| model | 0.8 % of each frequency | welds, ovality, play: ``likelihood.MODEL_ERROR`` |
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import pairwise
from typing import Any

import numpy as np
from numpy.typing import NDArray

from fieldkit.span.layout import Leg, PointMass, Span, State, Support
from fieldkit.span.structure import segments
from fieldkit.span.supports import Spring, springs

Array = NDArray[np.float64]

LENGTH_SD = 0.01
"""Relative, of each stretch between supports and corners, as paced or taped on site."""
MODULUS_SD = 0.01
STANDARD_WALL = (0.985, 0.5)
"""Median of wall over nominal, and sd of ln of what it lies below THICKEST_WALL: the mill tolerance
is one-sided, so that most pipe is a little thin, some much, and hardly any thick."""
THICKEST_WALL = 1.03
MEASURED_WALL = (1.0, 0.03)
LEAST_MASS_FACTOR = 0.05


@dataclass(frozen=True)
class Unknown:
    """One uncertain value; ``at(z)`` turns standard-normal numbers into it."""

    name: str
    unit: str
    role: str
    """``spring``, ``mass``, ``length``, ``modulus``, ``wall`` or ``fill``."""
    index: int
    """Which spring, mass or stretch; 0 where there is one only."""
    centre: float
    spread: float
    """Sd of ln for springs, sd for the others, half-width for a fill range."""
    state: str = ""
    """The state a fill belongs to; empty for what both states share."""
    ceiling: float | None = None
    """What the value stays below, ``spread`` being the sd of ln of the distance; None for an even
    doubt."""

    def at(self, z: Array) -> Array:
        """Physical values for standard-normal numbers; any shape."""
        if self.role == "spring":
            return np.asarray(self.centre * np.exp(self.spread * z))
        if self.role == "fill":
            return np.asarray(self.centre + self.spread * (2 * _normal_share(z) - 1))
        if self.ceiling is not None:
            return np.asarray(self.ceiling - self._below(z))
        if self.role == "mass":
            factor = 1 + self.spread * z
            return np.asarray(self.centre * np.maximum(factor, LEAST_MASS_FACTOR))
        return np.asarray(self.centre + self.spread * z)

    def slope(self, z: Array) -> Array:
        """Derivative of ``at`` with respect to z."""
        if self.role == "spring":
            return np.asarray(self.spread * self.at(z))
        if self.role == "fill":
            density = np.exp(-0.5 * z**2) / np.sqrt(2 * np.pi)
            return np.asarray(2 * self.spread * density)
        if self.ceiling is not None:
            return np.asarray(self.spread * self._below(z))
        if self.role == "mass":
            inside = 1 + self.spread * z > LEAST_MASS_FACTOR
            return np.asarray(np.where(inside, self.centre * self.spread, 0.0))
        return np.full_like(z, self.spread)

    def _below(self, z: Array) -> Array:
        """Distance from the ceiling; large z comes near it."""
        return np.asarray(((self.ceiling or 0.0) - self.centre) * np.exp(-self.spread * z))


def _normal_share(z: Array) -> Array:
    """Standard normal distribution function (Abramowitz and Stegun 1964, 26.2.17; 7.5e-8)."""
    t = 1 / (1 + 0.2316419 * np.abs(z))
    polynomial = t * (
        0.319381530 + t * (-0.356563782 + t * (1.781477937 + t * (-1.821255978 + t * 1.330274429)))
    )
    tail = np.exp(-0.5 * z**2) / np.sqrt(2 * np.pi) * polynomial
    return np.asarray(np.where(z >= 0, 1 - tail, tail))


def unknowns_of(span: Span, states: Sequence[State]) -> tuple[Unknown, ...]:
    """Every unknown of a span in these states, springs first."""
    return (
        *_spring_unknowns(span),
        *_mass_unknowns(span),
        *(_fill_unknown(state) for state in states if state.fill[1] > state.fill[0]),
        *_length_unknowns(span),
        Unknown("elastic modulus", "ratio", "modulus", 0, 1.0, MODULUS_SD),
        _wall_unknown(span),
    )


def member_span(span: Span, unknowns: Sequence[Unknown], z: Array) -> Span:
    """The span with every unknown at the values of one member; ``z`` is (parameters,)."""
    value = _values(unknowns, z)
    moved = station_map(span, unknowns, z)
    modulus = value[("modulus", 0)]
    material = replace(
        span.material,
        modulus_pa=tuple((t, modulus * e) for t, e in span.material.modulus_pa),
    )
    wall = span.pipe.wall_m * value[("wall", 0)]
    return replace(
        span,
        pipe=replace(span.pipe, wall_m=wall),
        material=material,
        legs=_member_legs(span, moved),
        supports=_member_supports(span, value, moved),
        masses=tuple(
            replace(m, at_m=moved(m.at_m), mass_kg=value.get(("mass", i), m.mass_kg))
            for i, m in enumerate(span.masses)
        ),
    )


def member_state(state: State, unknowns: Sequence[Unknown], z: Array) -> State:
    """The state with its fill at the value of one member."""
    for i, unknown in enumerate(unknowns):
        if unknown.role == "fill" and unknown.state == state.name:
            fill = float(unknown.at(z[i : i + 1])[0])
            return replace(state, fill=(fill, fill))
    return state


def _spring_unknowns(span: Span) -> list[Unknown]:
    return [
        Unknown(
            _spring_name(spring),
            "N m/rad" if spring.axis in ("rotation", "torsion") else "N/m",
            "spring",
            i,
            spring.stiffness,
            spring.sd_ln,
        )
        for i, spring in enumerate(springs(span))
        if spring.sd_ln > 0
    ]


def _spring_name(spring: Spring) -> str:
    return f"support {spring.support + 1} {spring.axis} at {spring.at_m:g} m"


def _mass_unknowns(span: Span) -> list[Unknown]:
    def doubt(i: int, mass: PointMass) -> Unknown:
        return Unknown(f"mass of {mass.name}", "kg", "mass", i, mass.mass_kg, mass.tolerance)

    return [doubt(i, m) for i, m in enumerate(span.masses) if m.tolerance > 0 and m.mass_kg > 0]


def _fill_unknown(state: State) -> Unknown:
    low, high = state.fill
    centre, half_width = 0.5 * (low + high), 0.5 * (high - low)
    return Unknown(f"fill, {state.name}", "ratio", "fill", 0, centre, half_width, state.name)


def _length_unknowns(span: Span) -> list[Unknown]:
    return [
        Unknown(f"length {a:g} to {b:g} m", "ratio", "length", i, 1.0, LENGTH_SD)
        for i, (a, b) in enumerate(segments(span))
    ]


def _wall_unknown(span: Span) -> Unknown:
    """By schedule the mill's tolerance; a wall given in millimetres was measured."""
    by_schedule = "schedule" in span.pipe.label
    median, spread = STANDARD_WALL if by_schedule else MEASURED_WALL
    ceiling = THICKEST_WALL if by_schedule else None
    return Unknown("wall thickness", "ratio", "wall", 0, median, spread, ceiling=ceiling)


class StationMap:
    """Where a nominal station lies after each stretch took its member's length."""

    def __init__(self, knots_m: Array, moved_m: Array) -> None:
        self.knots_m = knots_m
        self.moved_m = moved_m

    def __call__(self, at_m: float) -> float:
        """Station of this member, metres."""
        return float(np.interp(at_m, self.knots_m, self.moved_m))


def station_map(span: Span, unknowns: Sequence[Unknown], z: Array) -> StationMap:
    """Nominal to actual stations of one member; ``z`` is (parameters,)."""
    value = _values(unknowns, z)
    pieces = segments(span)
    knots = np.array([pieces[0][0], *(b for _, b in pieces)])
    lengths = [(b - a) * value[("length", i)] for i, (a, b) in enumerate(pieces)]
    return StationMap(knots, knots[0] + np.concatenate([[0.0], np.cumsum(lengths)]))


def _values(unknowns: Sequence[Unknown], z: Array) -> dict[tuple[str, int], float]:
    return {(u.role, u.index): float(u.at(z[i : i + 1])[0]) for i, u in enumerate(unknowns)}


def _member_legs(span: Span, moved: StationMap) -> tuple[Leg, ...]:
    corners = np.concatenate([[0.0], np.cumsum([leg.length_m for leg in span.legs])])
    return tuple(
        replace(leg, length_m=moved(float(b)) - moved(float(a)))
        for leg, (a, b) in zip(span.legs, pairwise(corners), strict=True)
    )


def _member_supports(
    span: Span, value: dict[tuple[str, int], float], moved: StationMap
) -> tuple[Support, ...]:
    """Supports with every stiffness stated, so that no prior is consulted again."""
    stated: list[dict[str, Any]] = [{} for _ in span.supports]
    for i, spring in enumerate(springs(span)):
        stated[spring.support][spring.axis] = value.get(("spring", i), spring.stiffness)
    return tuple(
        Support(moved(support.at_m), "free", **axes)
        for support, axes in zip(span.supports, stated, strict=True)
    )
