"""A change that was installed, held against the taps made after it.

The span before and the span after are two models of the same unknowns; what the change brought is
unknown too. The taps of both sides together give the updated ensemble; which way the change stands
(as drawn, softer, elsewhere, not at all...) is told by how well each explains the re-tap.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune import posterior
from fieldkit.detune.evidence import Evidence
from fieldkit.detune.excitation import Excitation, Goal, bands
from fieldkit.detune.fixes import AddAbsorber, Change, ChangeSpeed
from fieldkit.detune.known_modes import alike
from fieldkit.detune.match import FEW_EFFECTIVE, LEAST_EFFECTIVE, Group, grouped, seen_by
from fieldkit.detune.matched import Ensemble, Match
from fieldkit.detune.posterior import Population, Problem
from fieldkit.detune.push import parts
from fieldkit.detune.rank import PRIOR_MEMBERS
from fieldkit.detune.recheck_answer import UNSURE, WORKED, PromisedMode, Recheck
from fieldkit.detune.recheck_joint import believed, embedded, lowered
from fieldkit.detune.recheck_modes import Taken, Tracked, along_path, linked, taken, tracked
from fieldkit.detune.recheck_next import Standing, measure_next, mended, offers
from fieldkit.detune.recheck_reasons import found_in, found_of, reasons
from fieldkit.detune.recheck_spans import AS_DRAWN, LOOSE, NOTHING, OTHER, PLACE, STIFFNESS, pinned
from fieldkit.detune.recheck_verdict import Judged, Now, judged, verdict
from fieldkit.detune.recheck_ways import Known, Way, Weighed, drawn, probabilities, ways_of, weighed
from fieldkit.detune.reduced import build
from fieldkit.detune.unknowns import unknowns_of
from fieldkit.detune.wording import summary
from fieldkit.errors import Refusal
from fieldkit.progress import Progress
from fieldkit.signal.modes import MeasuredMode
from fieldkit.span.layout import Span, State

Array = NDArray[np.float64]

SEED = 41
DRAWS = 400
RETAPPED = "re-tapped"
PATH_STEPS = 13
ABOVE = 1.05
"""Modes are followed this far above the highest peak."""
SURE = 0.5
"""Below this probability of the likeliest way the user is told that others explain it too."""
NOT_THERE = {
    LOOSE: "the support seems to hold nothing: once it does, the modes move",
    NOTHING: "nothing of the change shows",
}
"""Ways of standing on which no success can be built."""
WHAT_TO_TAP = (
    "record three taps or more in each direction, where and how the taps before the change were "
    "made, and name the recordings"
)


@dataclass(frozen=True)
class Question:
    """Everything a recheck is worked out from."""

    span: Span
    """As it was before the change."""
    tapped: State
    running: State
    retapped: State
    """State of the pipe when it was tapped after the change."""
    before: Evidence
    match: Match | None
    """None where nothing was tapped before."""
    after: Evidence
    """Its modes are taken to be in the state of the re-tap."""
    change: Change
    chance_before: float
    excitations: tuple[Excitation, ...]
    goal: Goal
    units: str = "SI"


def recheck(asked: Question, progress: Progress | None = None) -> Recheck:
    """Predicted against measured, the verdict, the reasons and the next change.

    Raises Refusal where the re-tap shows no mode, where the change is none a re-tap can be held
    against, or where too few parameter sets explain both taps.
    """
    progress = progress or Progress()
    _require_answerable(asked)
    rng = np.random.default_rng(SEED)
    states = (asked.tapped, asked.running, replace(asked.retapped, name=RETAPPED))
    groups, reach_hz = grouped(_retapped(asked.after), asked.goal.up_to_hz), _reach_hz(asked)
    known = _known(asked, states, rng)
    made = ways_of(known, asked.change, states, groups, reach_hz, progress.within(0.0, 0.2))
    joint, model = made[0].joint, made[0].model
    promise = tracked(joint.after_span, model, drawn(known, joint, DRAWS, rng), reach_hz)
    held = []
    for i, way in enumerate(made):
        progress.step("weighing how the change may stand", 0.2 + 0.2 * i / len(made))
        held.append(weighed(known, way, rng))
    likely = probabilities(held, groups)
    leading = next(w for name in likely for w in held if w.way.name == name)
    now = _updated(asked, known, states, leading.way, groups, progress.within(0.4, 0.7))
    promised = _promised(promise, now, asked.goal.up_to_hz)
    return _answer(asked, states, promised, held, likely, now, progress.within(0.7, 1.0))


def _reach_hz(asked: Question) -> float:
    """Up to where modes are followed: a peak may lie above the goal's limit."""
    highest = max(mode.frequency_hz for mode in (*asked.after.modes, *asked.before.modes))
    return max(asked.goal.up_to_hz, ABOVE * highest)


def _require_answerable(asked: Question) -> None:
    if not asked.after.modes:
        raise Refusal("the recordings made after the change show no natural frequency", WHAT_TO_TAP)
    if any(isinstance(part, AddAbsorber) for part in parts(asked.change)):
        raise Refusal(
            "a tuned absorber splits a mode in two, which a recheck does not model",
            "compare the level at the machine's frequency before and after with fieldkit running",
        )


def _retapped(evidence: Evidence) -> tuple[MeasuredMode, ...]:
    return tuple(replace(mode, state=RETAPPED) for mode in evidence.modes)


def _known(asked: Question, states: Sequence[State], rng: np.random.Generator) -> Known:
    """The members of before: those of the match, or the prior's."""
    unknowns = unknowns_of(asked.span, states[:2])
    if asked.match is None:
        z = rng.standard_normal((PRIOR_MEMBERS, len(unknowns)))
    else:
        both = asked.match.ensemble
        z = both.standard if both.fresh is None else np.concatenate([both.standard, both.fresh])
    span = pinned(asked.span)
    return Known(span, unknowns, z, believed(span, unknowns, z))


def _promised(promise: Tracked, updated: _Updated, up_to_hz: float) -> tuple[PromisedMode, ...]:
    """Modes as drawn, each with the peak of the mode that it has become."""
    link = _link(promise, updated)
    peaks = {link[i]: peak for i, peak in updated.now.measured.items() if i in link}
    modes = []
    for label, direction in enumerate(promise.direction):
        low, median, high = promise.interval(label)
        if label in peaks or low <= up_to_hz:
            modes.append(PromisedMode(direction, low, median, high, peaks.get(label)))
    return tuple(sorted(modes, key=lambda mode: mode.median_hz))


def _link(promise: Tracked, updated: _Updated) -> dict[int, int]:
    """Which promised mode each mode is now."""
    way, now = updated.way, updated.now.tapped
    if way.name not in (AS_DRAWN, STIFFNESS, PLACE):
        return linked(now, promise)
    found = updated.population.z[now.central]
    back = found.copy()
    for j in way.joint.own:
        back[j] = _drawn(way, j)
    path = found + np.linspace(0.0, 1.0, PATH_STEPS)[:, None] * (back - found)
    return along_path(way.joint.after_span, way.model, now, path, promise)


def _drawn(way: Way, j: int) -> float:
    """Standard normal number at which a value of the change is as drawn."""
    key, unknown = way.joint.keys[j], way.joint.unknowns[j]
    if key[:2] != ("own", "spring"):
        return 0.0
    drawn = way.found.own_springs[(int(str(key[2])), str(key[3]))]
    return float(np.log(drawn / unknown.centre) / unknown.spread)


def _by_label(found: Sequence[Taken], groups: Sequence[Group]) -> dict[int, MeasuredMode]:
    """The clearest peak of each mode."""
    best: dict[int, MeasuredMode] = {}
    for one in found:
        peak = groups[one.group].modes[one.peak]
        if one.label not in best or peak.strength > best[one.label].strength:
            best[one.label] = peak
    return best


@dataclass(frozen=True)
class _Updated:
    """The ensemble that agrees with both taps, one way of standing taken."""

    way: Way
    population: Population
    now: Now
    fits: tuple[Array, ...]
    """(peaks,) by group: how surely each peak belongs to some mode."""


def _updated(
    asked: Question,
    known: Known,
    states: tuple[State, State, State],
    way: Way,
    groups: Sequence[Group],
    progress: Progress,
) -> _Updated:
    joint, up_to_hz = way.joint, _reach_hz(asked)
    old = unknowns_of(joint.before_span, states)
    number = {state.name: i for i, state in enumerate(states[:2])}
    models = [
        embedded(build(joint.before_span, state, old, up_to_hz), joint.before, joint)
        for state in states[:2]
    ]
    earlier = tuple(
        seen_by(joint.before_span, models, number[group.peaks.state], group)
        for group in grouped(asked.before.modes, up_to_hz)
    )
    later = tuple(replace(seen, model=2) for seen in way.seen)
    problem = Problem((*models, way.model), (*earlier, *later))
    population = posterior.sample(problem, np.random.default_rng(SEED), progress)
    _require_enough(population)
    aligned, _, _ = posterior.alignments(problem, population.z)
    belonging = [found.responsibility for found in aligned[len(earlier) :]]
    after, z = joint.after_span, population.z
    tapped = tracked(after, way.model, z, up_to_hz)
    new = unknowns_of(after, states)
    model = embedded(build(after, asked.running, new, up_to_hz), joint.after, joint)
    running = tracked(after, model, z, up_to_hz, like=tapped)
    peaks = taken([tapped.probability(share) for share in belonging])
    used = {(one.group, one.peak) for one in peaks}
    stray = [
        mode
        for n, group in enumerate(groups)
        for i, mode in enumerate(group.modes)
        if (n, i) not in used
    ]
    same = alike(asked.retapped, asked.running)
    now = Now(tapped, running, _by_label(peaks, groups), tuple(stray), same)
    return _Updated(way, population, now, tuple(b.sum(axis=2).mean(axis=0) for b in belonging))


def _require_enough(population: Population) -> None:
    if population.effective_size < LEAST_EFFECTIVE:
        raise Refusal(
            "the taps before and after the change can be explained together in so many unlike "
            f"ways that the ensemble is worth {population.effective_size:.0f} independent "
            "parameter sets only, too few to judge by",
            "tap the other direction too, and beside the change itself",
        )


def _answer(
    asked: Question,
    states: tuple[State, State, State],
    promised: tuple[PromisedMode, ...],
    held: Sequence[Weighed],
    likely: dict[str, float],
    updated: _Updated,
    progress: Progress,
) -> Recheck:
    excitations = _excitations(asked)
    found = judged(updated.now, excitations, asked.goal)
    said, because = verdict(found, asked.goal)
    said, because = _as_it_stands(said, because, next(iter(likely)))
    odd = any(mode.inside is False for mode in promised) or bool(updated.now.stray)
    odd |= next(iter(likely)) != AS_DRAWN
    brought = found_of(updated.way.found, updated.way.joint, updated.population.z)
    by_way = {one.way.name: found_in(one) for one in held} | {updated.way.name: brought}
    stray = 1.0 if updated.now.stray and updated.way.name == AS_DRAWN else 0.0
    span_now, ensemble = _installed(updated, states)
    progress.step("looking for the next change", 0.0)
    after = Match(asked.after.modes, (), (), (), ensemble, (), "", ())
    settled = said == WORKED or updated.way.name == NOTHING
    there = Standing(span_now, asked.tapped, asked.running, after, excitations, asked.goal)
    offered = None if settled else offers(there, asked.units, progress)
    return Recheck(
        change=asked.change,
        summary=summary(asked.change, asked.span, asked.units),
        state=asked.retapped.name,
        same_state=updated.now.same_state,
        promised=promised,
        unexplained=tuple(updated.now.stray),
        running=found.modes,
        bands_measured=bands(excitations, asked.goal.margin_measured),
        margin=asked.goal.margin,
        margin_measured=asked.goal.margin_measured,
        chance_before=asked.chance_before,
        chance_now=found.chance,
        verdict=said,
        because=because,
        measure_next=_measure(updated, found, asked.goal, said),
        ways=tuple(likely.items()),
        found=brought,
        reasons=reasons(likely, stray, by_way, asked.units) if odd else (),
        effective_members=updated.population.effective_size,
        span_now=span_now,
        mended=None if settled else mended(there, updated.way.found, brought, asked.units),
        next_fixes=offered,
        warnings=_warnings(asked, likely, updated.population, found),
    )


def _as_it_stands(said: str, because: str, name: str) -> tuple[str, str]:
    """The verdict, held back where the change does not stand so that it can be relied on."""
    if said != UNSURE and name == OTHER:
        return UNSURE, "what was tapped is hardly explained by this span at all"
    if said == WORKED and name in NOT_THERE:
        return UNSURE, f"every mode is clear as it stands, but {NOT_THERE[name]}"
    if said == WORKED and name != AS_DRAWN:
        return said, f"{because}, though the change does not stand as drawn"
    return said, because


def _measure(updated: _Updated, found: Judged, goal: Goal, said: str) -> str:
    """What to tap where nothing can be said yet."""
    if said != UNSURE:
        return ""
    if updated.way.name in NOT_THERE and found.chance >= goal.chance:
        return "see that the change is in place and tight, then tap again"
    return measure_next(updated.now, found, goal)


def _excitations(asked: Question) -> tuple[Excitation, ...]:
    """With the speeds of the change."""
    speeds = {p.excitation: p for p in parts(asked.change) if isinstance(p, ChangeSpeed)}
    return tuple(
        replace(e, speed_hz=(speeds[e.name].low_hz, speeds[e.name].high_hz))
        if e.name in speeds
        else e
        for e in asked.excitations
    )


def _installed(updated: _Updated, states: tuple[State, State, State]) -> tuple[Span, Ensemble]:
    """The span as it is found and the members of it alone, to look for the next change with."""
    way, population = updated.way, updated.population
    unknowns = unknowns_of(way.found.after, states[:2])
    z = lowered(way.joint, way.found, unknowns, population.z)
    order = np.argsort(population.family, kind="stable")
    chosen, fresh = np.array_split(z[order], 2)
    names = tuple(unknown.name for unknown in unknowns)
    even = np.full(len(chosen), 1.0 / len(chosen))
    return way.found.after, Ensemble(names, chosen, even, fresh, population.effective_size)


def _warnings(
    asked: Question, likely: dict[str, float], population: Population, found: Judged
) -> tuple[str, ...]:
    said = list(asked.after.warnings)
    if asked.match is None:
        said.append(
            "nothing was tapped before the change: what was promised rests on what supports are "
            "usually worth"
        )
    first, share = next(iter(likely.items()))
    if share < SURE:
        second = list(likely)[1]
        said.append(
            f"the re-tap does not tell {first!r} ({100 * share:.0f} %) from {second!r} "
            f"({100 * likely[second]:.0f} %)"
        )
    if population.effective_size < FEW_EFFECTIVE:
        said.append(
            "both taps together can be explained in many unlike ways: the ensemble is worth about "
            f"{population.effective_size:.0f} independent parameter sets, its intervals are rough"
        )
    return tuple(dict.fromkeys(said))
