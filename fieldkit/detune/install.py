"""What is needed to install a fix: how stiff, which bracket, and what it does to the line at rest.

Stiffness only is designed here; strength, welds, anchors and the flexibility of the line are for
the responsible engineer.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.cautions import Resting, at_rest, working_cautions
from fieldkit.detune.excitation import Band, Excitation, Goal, bands
from fieldkit.detune.field import Field, field
from fieldkit.detune.fixes import (
    AddAbsorber,
    AddMass,
    AddSupport,
    Change,
    MoveMass,
    MoveSupport,
    StiffenSupport,
)
from fieldkit.detune.matched import Match
from fieldkit.detune.push import parts
from fieldkit.detune.reduced import build
from fieldkit.detune.scatter import JUDGING_SEED, Scatter, as_installed
from fieldkit.detune.unknowns import unknowns_of
from fieldkit.detune.window import stated_stiffness, stiffness_window
from fieldkit.errors import Refusal
from fieldkit.span.layout import Span, State
from fieldkit.span.span_rule import RuleReading, against_rule
from fieldkit.span.static import WeightAnswer, weight_answer
from fieldkit.span.supports import on_header, springs
from fieldkit.steel.brackets import BASE_N_PER_M, HEADER_BASE_N_PER_M, REACH_M, Bracket, brackets

Array = NDArray[np.float64]

AXES = ("vertical", "lateral", "axial")
PRIOR_MEMBERS = 256
SEED = 20


@dataclass(frozen=True)
class AtRest:
    """The line under its weight, running, before and after a fix."""

    before: WeightAnswer
    after: WeightAnswer
    rule_before: RuleReading
    rule_after: RuleReading


@dataclass(frozen=True)
class Heated:
    """One direction at the station of a fix, from tapped to running."""

    movement_m: float
    """Free movement; along its own sign where the direction is one line."""
    force_n: float
    """By which a spring as stiff as the fix, set as tapped, would hold it back."""
    held: bool
    """Whether the fix restrains this direction."""


@dataclass(frozen=True)
class Installation:
    """Everything known about putting one fix in."""

    at_m: float | None
    """Station; None where the fix has none."""
    stiffness_n_per_m: Mapping[str, float]
    """By direction, what was promised for; empty where the fix is no stiffness."""
    kept: bool | None
    """Whether the wanted chance is reached as drawn; None where no stiffness is stated."""
    fails_below_n_per_m: Mapping[str, float] | None
    """Drawn less stiff than this the chance falls under the goal's; None where it does anyway."""
    fails_above_n_per_m: Mapping[str, float] | None
    """The same for more; None where no stiffness is too much."""
    brackets: tuple[Bracket, ...]
    reach_m: float
    to_header: bool
    """Whether it is braced back to a header, not to structure."""
    added_load_n: float | None
    """Weight that a new support, set free of load as tapped, comes to carry by filling, or that a
    moved or stiffened one carries."""
    at_rest: AtRest | None
    rest_refused: str
    heat: Mapping[str, Heated]
    cautions: tuple[str, ...]


@dataclass(frozen=True)
class Yard:
    """What every installation of one job is worked out from."""

    field: Field
    bands: tuple[Band, ...]
    goal: Goal
    scatter: Scatter
    """Of installation."""
    resting: Resting
    units: str


def yard(
    span: Span,
    tapped: State,
    running: State,
    match: Match | None,
    excitations: Sequence[Excitation],
    goal: Goal,
    units: str = "SI",
) -> Yard:
    """The members a change is judged on, running, and the line at rest, with the same scatter."""
    unknowns = unknowns_of(span, (tapped, running))
    if match is None:
        rng = np.random.default_rng(SEED)
        members = rng.standard_normal((PRIOR_MEMBERS, len(unknowns)))
    else:
        rng, members = np.random.default_rng(JUDGING_SEED), match.ensemble.judging
    base: Field = field(span, build(span, running, unknowns, goal.up_to_hz), members)
    return Yard(
        field=base,
        bands=bands(excitations, goal.margin),
        goal=goal,
        scatter=as_installed(base.members, rng).exact(base.central),
        resting=at_rest(span, tapped, running),
        units=units,
    )


def installations(yard: Yard, change: Change, reach_m: float = REACH_M) -> tuple[Installation, ...]:
    """What is needed to put each part of a change in; the line at rest is shown with all of it.

    A bracket spans ``reach_m`` from steel to pipe.
    """
    rest = _resting(yard.resting, change)
    return tuple(
        _part(yard, change, number, part, rest, reach_m)
        for number, part in enumerate(parts(change))
    )


def _part(
    yard: Yard,
    whole: Change,
    number: int,
    change: Change,
    rest: tuple[AtRest | None, str],
    reach_m: float,
) -> Installation:
    span = yard.resting.span
    stated, at_m = stated_stiffness(change), station_of(change, span)
    window = stiffness_window(yard.field, whole, number, yard.bands, yard.goal, yard.scatter)
    below = window.fails_below if window else None
    above = window.fails_above if window else None
    to_header = on_header(span)
    resting, refused = rest
    return Installation(
        at_m=at_m,
        stiffness_n_per_m=stated,
        kept=window.kept_as_drawn if window else None,
        fails_below_n_per_m=None if below is None else _scaled(stated, below),
        fails_above_n_per_m=None if above is None else _scaled(stated, above),
        brackets=_brackets(stated, span, reach_m, yard.units, to_header=to_header),
        reach_m=reach_m,
        to_header=to_header,
        added_load_n=_added_load(yard.resting, change, resting),
        at_rest=resting,
        rest_refused=refused,
        heat=_heat(yard.resting, at_m, _holding(change, span)) if at_m is not None else {},
        cautions=working_cautions(change, yard.resting, yard.units),
    )


def _holding(change: Change, span: Span) -> dict[str, float]:
    """N/m by direction that the change puts at its station; a moved support brings its own."""
    if isinstance(change, MoveSupport):
        own = [s for s in springs(span) if s.support == change.index and s.axis in AXES]
        return {s.axis: s.stiffness for s in own}
    return stated_stiffness(change)


def station_of(change: Change, span: Span) -> float | None:
    """Where a change is put in; None where it has no one place."""
    if isinstance(change, AddSupport | AddMass | AddAbsorber):
        return change.at_m
    if isinstance(change, MoveSupport | MoveMass):
        return change.to_m
    return span.supports[change.index].at_m if isinstance(change, StiffenSupport) else None


def _scaled(stated: Mapping[str, float], share: float) -> dict[str, float]:
    return {axis: share * value for axis, value in stated.items()}


def _brackets(
    stated: Mapping[str, float], span: Span, reach_m: float, units: str, *, to_header: bool
) -> tuple[Bracket, ...]:
    if not stated or "axial" in stated:
        return ()
    return brackets(
        stated.get("vertical", 0.0),
        stated.get("lateral", 0.0),
        span.pipe.outside_diameter_m,
        reach_m=reach_m,
        base_n_per_m=HEADER_BASE_N_PER_M if to_header else BASE_N_PER_M,
        units=units,
    )


def _resting(resting: Resting, change: Change) -> tuple[AtRest | None, str]:
    if resting.weight is None:
        return None, resting.weight_refused
    try:
        after = weight_answer(change.apply(resting.span), resting.running)
    except Refusal as refusal:
        return None, str(refusal)
    diameter = resting.span.pipe.outside_diameter_m
    before = resting.weight
    rules = (against_rule(answer, diameter) for answer in (before, after))
    return AtRest(before, after, *rules), ""


def _added_load(resting: Resting, change: Change, rest: AtRest | None) -> float | None:
    if isinstance(change, AddSupport) and change.vertical_n_per_m:
        load = resting.holding.load(change.at_m, "vertical", change.vertical_n_per_m)
        return float(np.linalg.norm(load.filling_n))
    if isinstance(change, MoveSupport | StiffenSupport) and rest is not None:
        return float(np.linalg.norm(dict(rest.after.support_loads)[change.index]))
    return None


def _heat(resting: Resting, at_m: float, stated: Mapping[str, float]) -> dict[str, Heated]:
    """Movement and force in each direction; one that is not held as if it were held as stiffly."""
    stiffest = max(stated.values(), default=0.0)
    found = {}
    for axis in AXES:
        moved = resting.holding.movement(at_m, axis)
        size = float(moved[0]) if len(moved) == 1 else float(np.linalg.norm(moved))
        stiffness = stated.get(axis, stiffest)
        force = resting.holding.load(at_m, axis, stiffness).heat_n if stiffness else np.zeros(3)
        found[axis] = Heated(size, float(np.linalg.norm(force)), axis in stated)
    return found
