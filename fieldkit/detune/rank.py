"""From all candidates to the ranked answer."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune import judge, speeds
from fieldkit.detune.candidates import Candidate, Search, generate
from fieldkit.detune.cautions import ALWAYS, Resting, at_rest, cautions
from fieldkit.detune.excitation import Band, Excitation, Goal, bands
from fieldkit.detune.field import Field, field
from fieldkit.detune.fixes import Change
from fieldkit.detune.matched import Match
from fieldkit.detune.order import order, shortlist
from fieldkit.detune.other_cures import other_cures
from fieldkit.detune.pairs import pairs
from fieldkit.detune.push import parts
from fieldkit.detune.reduced import build
from fieldkit.detune.scatter import JUDGING_SEED, as_installed
from fieldkit.detune.speeds import SpeedOffer, speed_offers
from fieldkit.detune.unknowns import unknowns_of
from fieldkit.detune.verdict import Detuning, Nearest, Verdict
from fieldkit.detune.why import fails, why
from fieldkit.detune.window import SHARES, scaled
from fieldkit.detune.wording import speed_summary, summary
from fieldkit.errors import InputError, Place
from fieldkit.progress import Progress
from fieldkit.span.layout import Span, State

Array = NDArray[np.float64]

SHOWN = 10
WHAT_ELSE_HELPS = (
    "what else helps: another speed, an absorber or added damping where they are listed, or to "
    "narrow the doubt with a better tap"
)
SEED = 20
PRIOR_MEMBERS = 256


@dataclass(frozen=True)
class _Judged:
    candidate: Candidate
    spectrum: judge.Spectrum
    chance: float
    correction: float
    room: float
    """Separation left to the nearest band, by the medians."""


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
    search, known = prepare(span, tapped, running, match, excitations, goal, progress)
    fresh = afresh(search, match)
    progress.step("solving the running state", 0.0)
    now, _ = _checked(fresh, running, None)
    chance_now = judge.chance_clear(now, search.bands, goal.up_to_hz)
    singles = generate(search, progress.within(0.0, 0.5))
    judged = _re_solved(
        fresh, running, shortlist(singles, span, goal, chance_now), progress.within(0.5, 0.7)
    )
    if max([chance_now, *(j.chance for j in judged)]) < goal.chance:
        both = pairs(search, singles, progress.within(0.7, 0.9))
        chosen = shortlist(both, span, goal, max([chance_now, *(j.chance for j in judged)]))
        judged += _re_solved(fresh, running, chosen, progress.within(0.9, 0.95))
    short = max([chance_now, *(j.chance for j in judged)]) < goal.chance
    judged.sort(key=lambda j: order(j.chance, j.candidate.change, span, goal, j.room))
    describing = progress.within(0.95, 1.0)
    shown = _described(fresh, at_rest(span, tapped, running), now, judged, units, describing)
    if short and "speed" in goal.allow:
        choosing = judge.now(search.field, goal.up_to_hz)
        shown += _speed_verdicts(
            speed_offers(choosing, now, excitations, goal), excitations, now, goal
        )
        shown.sort(key=lambda v: order(v.chance, v.change, span, goal, v.nearest.separation))
    verdicts = tuple(replace(v, rank=rank) for rank, v in enumerate(shown[:SHOWN], start=1))
    modes = judge.judged_modes(now, search.bands, goal.up_to_hz)
    describing.step("describing the best changes", 1.0)
    return Detuning(
        state=running.name,
        margin=goal.margin,
        bands=search.bands,
        modes=modes,
        chance_now=chance_now,
        nearest_now=judge.nearest(modes, search.bands),
        fixes=verdicts,
        warnings=_warnings(known, verdicts, judged, goal, search.bands),
        tried=len(singles),
        other_cures=other_cures(fresh, now, match, units) if short else (),
    )


def prepare(
    span: Span,
    tapped: State,
    running: State,
    match: Match | None,
    excitations: Sequence[Excitation],
    goal: Goal,
    progress: Progress | None = None,
) -> tuple[Search, bool]:
    """What changes are looked for in, and whether a measurement shaped it.

    Raises InputError without an excitation and Refusal where the span cannot be solved.
    """
    if not excitations:
        raise InputError(
            "the job names no excitation",
            "add an [[excitation]] with the machine's speed and orders, or its frequency",
            Place(field="excitation"),
        )
    rng = np.random.default_rng(SEED)
    progress = progress or Progress()
    progress.step("solving the running state", 0.0)
    base, known = _ensemble_field(span, tapped, running, match, goal, rng)
    progress.step("solving the running state", 0.0)
    scatter = as_installed(base.members, rng).exact(base.central)
    return Search(span, base, bands(excitations, goal.margin), goal, scatter), known


def afresh(search: Search, match: Match | None) -> Search:
    """The same search over members that had no say in what was chosen.

    The best of thousands of changes on one ensemble owes part of its chance to that ensemble.
    """
    if match is None or match.ensemble.fresh is None:
        return search
    base = search.field.of(match.ensemble.judging)
    rng = np.random.default_rng(JUDGING_SEED)
    scatter = as_installed(base.members, rng).exact(base.central)
    return replace(search, field=base, scatter=scatter)


def judged_change(
    search: Search, tapped: State, running: State, change: Change, units: str = "SI"
) -> Verdict:
    """Any one change, re-solved and described like a ranked one."""
    now, _ = _checked(search, running, None)
    judged = _judge(search, running, search.counted(change))
    return _verdict(search, at_rest(search.span, tapped, running), now, judged, 1, units)


def _re_solved(
    search: Search, running: State, chosen: Sequence[Candidate], progress: Progress
) -> list[_Judged]:
    judged = []
    for i, candidate in enumerate(chosen):
        progress.step("re-solving the best changes", i / len(chosen))
        judged.append(_judge(search, running, candidate))
    return judged


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


def _checked(search: Search, running: State, change: Change | None) -> tuple[judge.Spectrum, float]:
    """Ensemble frequencies scaled to the full re-solve at the central member."""
    base, up_to_hz = search.field, search.goal.up_to_hz
    if change is None:
        spectrum = judge.now(base, up_to_hz)
    else:
        spectrum = judge.after(base, search.push(change), up_to_hz)
    exact = judge.resolve(base, search.span, running, change, 1.3 * up_to_hz)
    return judge.corrected(spectrum, base, exact, up_to_hz)


def _judge(search: Search, running: State, candidate: Candidate) -> _Judged:
    spectrum, correction = _checked(search, running, candidate.change)
    up_to_hz = search.goal.up_to_hz
    chance = judge.chance_clear(spectrum, search.bands, up_to_hz)
    modes = judge.judged_modes(spectrum, search.bands, up_to_hz)
    nearest = judge.nearest(modes, search.bands)
    return _Judged(candidate, spectrum, chance, correction, nearest.separation if nearest else 1.0)


def _described(
    search: Search,
    resting: Resting,
    now: judge.Spectrum,
    judged: Sequence[_Judged],
    units: str,
    progress: Progress,
) -> list[Verdict]:
    """The best as verdicts, in the order given."""
    found = []
    for i, one in enumerate(judged[:SHOWN]):
        progress.step("describing the best changes", i / SHOWN)
        found.append(_verdict(search, resting, now, one, 0, units))
    return found


def _verdict(
    search: Search,
    resting: Resting,
    now: judge.Spectrum,
    judged: _Judged,
    rank: int,
    units: str,
) -> Verdict:
    change, up_to_hz = judged.candidate.change, search.goal.up_to_hz
    modes = judge.judged_modes(judged.spectrum, search.bands, up_to_hz)
    least = least_share(search, change) if judged.chance >= search.goal.chance else None
    return Verdict(
        rank=rank,
        kind=change.kind,
        summary=summary(change, search.span, units),
        change=change,
        modes_after=modes,
        nearest=judge.nearest(modes, search.bands) or Nearest("", 1.0),
        chance=judged.chance,
        cautions=_cautions(change, resting, least, search.goal, units),
        why=why(now, judged.spectrum, search.bands, up_to_hz),
        fails=fails(judged.spectrum, search.bands, up_to_hz),
    )


def _speed_verdicts(
    offers: Sequence[SpeedOffer],
    excitations: Sequence[Excitation],
    now: judge.Spectrum,
    goal: Goal,
) -> list[Verdict]:
    """Speeds as verdicts: the modes stay, the bands move."""
    found = []
    for offer in offers:
        machine = next(e for e in excitations if e.name == offer.change.excitation)
        modes = judge.judged_modes(now, offer.bands, goal.up_to_hz)
        found.append(
            Verdict(
                rank=0,
                kind="speed",
                summary=speed_summary(offer.change),
                change=offer.change,
                modes_after=modes,
                nearest=judge.nearest(modes, offer.bands) or Nearest("", 1.0),
                chance=offer.chance,
                cautions=speeds.CAUTIONS,
                why=speeds.why_speed(offer, machine),
                fails=speeds.FAILS,
            )
        )
    return found


def _cautions(
    change: Change, resting: Resting, least: float | None, goal: Goal, units: str
) -> tuple[str, ...]:
    """Of every part, each with the parts before it already made."""
    found: list[str] = []
    for part in parts(change):
        found += cautions(part, resting, least, goal, units)
        if part is not parts(change)[-1]:
            resting = at_rest(part.apply(resting.span), resting.tapped, resting.running)
    every = [text for text in dict.fromkeys(found) if text != ALWAYS]
    return (*every, ALWAYS)


def least_share(search: Search, change: Change) -> float | None:
    """Smallest share of the stiffness a change states that still keeps the wanted chance."""
    push = search.push(change)
    states_none = scaled(change, 0.5) == change
    if states_none or not push.stiffness.any() or push.without_springs:
        return None
    kept = 1.0
    for share in SHARES[SHARES <= 1][::-1]:
        if search.counted(scaled(change, float(share))).chance < search.goal.chance:
            return kept
        kept = float(share)
    return kept


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
            f"no single change reaches the wanted chance of {100 * goal.chance:.0f} %, nor do two "
            f"together (best {100 * best:.0f} %); {WHAT_ELSE_HELPS}"
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
