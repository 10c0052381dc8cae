"""From all candidates to the ranked answer."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune import judge
from fieldkit.detune.candidates import Candidate, Push, Search, generate
from fieldkit.detune.cautions import Resting, at_rest, cautions
from fieldkit.detune.effort import effort
from fieldkit.detune.excitation import Band, Excitation, Goal, bands
from fieldkit.detune.field import Field, field
from fieldkit.detune.matched import Match
from fieldkit.detune.reduced import build
from fieldkit.detune.screen import as_installed, counter
from fieldkit.detune.unknowns import unknowns_of
from fieldkit.detune.verdict import Detuning, Nearest, Verdict
from fieldkit.detune.wording import summary
from fieldkit.errors import InputError, Place
from fieldkit.progress import Progress
from fieldkit.span.layout import Span, State

Array = NDArray[np.float64]

SHOWN = 10
JUDGED = 12
PER_FAMILY = 5
CHANCE_STEP = 0.03
"""Chances closer than this count as equal when the smaller change is looked for."""
ALIKE_SHARE = 0.07
"""Changes closer along the span than this share of its length are one idea."""
WORTHWHILE = 0.02
"""A change must raise the chance by more than this to be listed."""
WHAT_ELSE_HELPS = (
    "what else helps: keep the machine out of part of its speed range, add damping, fit a tuned "
    "absorber, combine two changes, or narrow the doubt with a better tap"
)
SEED = 20
PRIOR_MEMBERS = 256
SOFTENING = np.geomspace(1.0, 0.01, 25)


@dataclass(frozen=True)
class _Judged:
    candidate: Candidate
    spectrum: judge.Spectrum
    chance: float
    correction: float


def detune(
    span: Span,
    tapped: State,
    running: State,
    match: Match | None,
    excitations: Sequence[Excitation],
    goal: Goal,
    units: str = "SI",
    progress: Progress | None = None,
) -> Detuning:
    """Rank changes that move every mode up to the goal's limit out of every band.

    Works on the ensemble of ``match``, or on the prior where nothing was measured. Raises
    InputError without an excitation and Refusal where the span cannot be solved.
    """
    progress = progress or Progress()
    if not excitations:
        raise InputError(
            "the job names no excitation",
            "add an [[excitation]] with the machine's speed and orders, or its frequency",
            Place(field="excitation"),
        )
    forbidden = bands(excitations, goal.margin)
    rng = np.random.default_rng(SEED)
    progress.step("solving the running state", 0.0)
    ensemble_field, known = _ensemble_field(span, tapped, running, match, goal, rng)
    now, _ = _checked(ensemble_field, span, running, None, goal)
    search = _search(span, ensemble_field, forbidden, goal, rng)
    chance_now = judge.chance_clear(now, forbidden, goal.up_to_hz)
    chosen = shortlist(generate(search, progress), span, chance_now)
    judged = []
    for i, candidate in enumerate(chosen):
        progress.step("re-solving the best changes", i / max(1, len(chosen)))
        judged.append(_judge(search, running, candidate))
    judged.sort(key=lambda j: _order(j.chance, j.candidate, span))
    resting = at_rest(span, tapped, running)
    verdicts = tuple(
        _verdict(search, resting, j, rank, units) for rank, j in enumerate(judged[:SHOWN], start=1)
    )
    modes = judge.judged_modes(now, forbidden, goal.up_to_hz)
    return Detuning(
        state=running.name,
        margin=goal.margin,
        bands=forbidden,
        modes=modes,
        chance_now=chance_now,
        nearest_now=judge.nearest(modes, forbidden),
        fixes=verdicts,
        warnings=_warnings(known, verdicts, judged, goal, forbidden),
    )


def shortlist(candidates: Sequence[Candidate], span: Span, chance_now: float) -> list[Candidate]:
    """The best candidates that help at all, unlike each other, a few of each family."""
    better = [c for c in candidates if c.chance > chance_now + WORTHWHILE]
    ranked = sorted(better, key=lambda c: _order(c.chance, c, span))
    chosen: list[Candidate] = []
    for candidate in ranked:
        same = [c for c in chosen if c.change.kind == candidate.change.kind]
        if len(same) < PER_FAMILY and not any(_alike(c, candidate, span) for c in same):
            chosen.append(candidate)
        if len(chosen) == JUDGED:
            break
    return chosen


def _order(chance: float, candidate: Candidate, span: Span) -> tuple[int, float, float]:
    step = int(min(chance, 1 - CHANCE_STEP / 2) / CHANCE_STEP)
    return (-step, effort(candidate.change, span), -chance)


def _alike(a: Candidate, b: Candidate, span: Span) -> bool:
    """Whether two changes of one family are the same idea at nearly the same place."""
    if type(a.change) is not type(b.change):
        return False
    if getattr(a.change, "index", None) != getattr(b.change, "index", None):
        return False
    where_a, where_b = _station(a), _station(b)
    if where_a is None or where_b is None:
        return True
    return abs(where_a - where_b) < ALIKE_SHARE * span.length_m


def _station(candidate: Candidate) -> float | None:
    change = candidate.change
    found = getattr(change, "at_m", None)
    return found if found is not None else getattr(change, "to_m", None)


def _ensemble_field(
    span: Span,
    tapped: State,
    running: State,
    match: Match | None,
    goal: Goal,
    rng: np.random.Generator,
) -> tuple[Field, bool]:
    """The members in the running state, and whether a measurement shaped them."""
    unknowns = unknowns_of(span, (tapped, running))
    model = build(span, running, unknowns, goal.up_to_hz)
    if match is None:
        return field(span, model, rng.standard_normal((PRIOR_MEMBERS, len(unknowns)))), False
    return field(span, model, match.ensemble.standard), True


def _search(
    span: Span, base: Field, forbidden: tuple[Band, ...], goal: Goal, rng: np.random.Generator
) -> Search:
    """The central member is installed exactly as drawn, so that it can be re-solved in full."""
    scatter = as_installed(base.members, rng)
    factor, place = scatter.stiffness_factor.copy(), scatter.place_m.copy()
    factor[base.central], place[base.central] = 1.0, 0.0
    return Search(
        span, base, forbidden, goal, replace(scatter, stiffness_factor=factor, place_m=place)
    )


def _checked(
    base: Field, span: Span, running: State, candidate: Candidate | None, goal: Goal
) -> tuple[judge.Spectrum, float]:
    """Ensemble frequencies scaled to the full re-solve at the central member."""
    push = candidate.push if candidate else None
    spectrum = judge.after(base, push, goal.up_to_hz) if push else judge.now(base, goal.up_to_hz)
    change = candidate.change if candidate else None
    exact = judge.resolve(base, span, running, change, 1.3 * goal.up_to_hz)
    return judge.corrected(spectrum, base, exact, goal.up_to_hz)


def _judge(search: Search, running: State, candidate: Candidate) -> _Judged:
    spectrum, correction = _checked(search.field, search.span, running, candidate, search.goal)
    chance = judge.chance_clear(spectrum, search.bands, search.goal.up_to_hz)
    return _Judged(candidate, spectrum, chance, correction)


def _verdict(search: Search, resting: Resting, judged: _Judged, rank: int, units: str) -> Verdict:
    change = judged.candidate.change
    modes = judge.judged_modes(judged.spectrum, search.bands, search.goal.up_to_hz)
    least = (
        least_share(search, judged.candidate.push) if judged.chance >= search.goal.chance else None
    )
    return Verdict(
        rank=rank,
        kind=change.kind,
        summary=summary(change, search.span, units),
        change=change,
        modes_after=modes,
        nearest=judge.nearest(modes, search.bands) or Nearest("", 1.0),
        chance=judged.chance,
        cautions=cautions(change, resting, least, search.goal, units),
    )


def least_share(search: Search, push: Push) -> float | None:
    """Smallest share of a new spring's stiffness that still keeps the wanted chance."""
    if push.stiffness is None or push.without_springs:
        return None
    count = counter(search.field, search.bands, search.goal.up_to_hz)
    shape = push.moved_by
    if shape is None:
        shape = search.field.motion(push.ports)
    residual = search.field.ports.residual[np.ix_(push.ports, push.ports)]
    receptance = count.receptance(shape, residual)
    levels = SOFTENING[:, None, None] * push.stiffness[None]
    chance = count.clear_with_springs(receptance, levels).mean(axis=1)
    kept = np.flatnonzero(chance < search.goal.chance)
    last = len(SOFTENING) - 1 if not len(kept) else int(kept[0]) - 1
    return float(SOFTENING[last]) if last >= 0 else 1.0


def _warnings(
    known: bool,
    verdicts: tuple[Verdict, ...],
    judged: Sequence[_Judged],
    goal: Goal,
    forbidden: Sequence[Band],
) -> tuple[str, ...]:
    found = []
    if not known:
        found.append(
            "nothing was measured on this pipe: the chances rest on what supports of this kind are "
            "usually worth; tap it before buying steel"
        )
    best = max((v.chance for v in verdicts), default=0.0)
    if best < goal.chance:
        found.append(
            f"no single change reaches the wanted chance of {100 * goal.chance:.0f} % "
            f"(best {100 * best:.0f} %); {WHAT_ELSE_HELPS}"
        )
    worst = max((j.correction for j in judged), default=0.0)
    if worst > judge.WORST_DISAGREEMENT:
        found.append(
            f"the quick model missed the full re-solve by up to {100 * worst:.1f} %; the figures "
            "shown are scaled to the full re-solve"
        )
    if all(band.avoid_low_hz > goal.up_to_hz for band in forbidden):
        found.append(
            f"every excitation lies above {goal.up_to_hz:g} Hz, the highest mode looked at; raise "
            "up_to in [goal]"
        )
    return tuple(found)
