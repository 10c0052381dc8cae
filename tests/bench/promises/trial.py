"""One span of the bench: tapped, matched, answered, and the answer built into the hidden plant."""

from __future__ import annotations

import time
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from fieldkit.detune.evidence import Evidence
from fieldkit.detune.excitation import Band, Excitation, Goal, clear_of_all
from fieldkit.detune.fixes import Change
from fieldkit.detune.match import match
from fieldkit.detune.rank import detune
from fieldkit.detune.verdict import Detuning, JudgedMode
from fieldkit.errors import Refusal
from fieldkit.span.layout import Span
from tests.bench.promises import usual
from tests.bench.promises.exact import ExactMode
from tests.bench.promises.families import FAMILIES, Described, described
from tests.bench.promises.taps import tapped
from tests.bench.promises.truth import Truth, hidden, installed

Draw = np.random.Generator

BUILT = ("support", "move", "stiffen", "mass")
"""Families a fitter can build into the hidden plant."""
NOMINAL, SCALED = "nominal", "scaled"
NEAREST_HZ = 0.012
"""How far beside a mode the machine runs, relative."""
FIRST = 2
"""Modes after the change whose intervals are checked."""


@dataclass(frozen=True)
class Trial:
    """What came out on one span."""

    family: str
    way: str
    seed: int
    peaks: int
    refused: str = ""
    promised: float | None = None
    """Chance of the first fix; None where none was offered."""
    kept: bool | None = None
    kind: str = ""
    covered: tuple[bool, ...] = ()
    """The first modes after the change, each against its 90 % interval."""
    covered_now: tuple[bool, ...] = ()
    error: tuple[float, ...] = ()
    """Of the medians, relative."""
    usual_kept: tuple[tuple[str, bool], ...] = ()
    """(way, kept) where that way offers anything."""
    effective: float = 0.0
    match_s: float = 0.0
    detune_s: float = 0.0


@dataclass(frozen=True)
class Plan:
    """Which span."""

    family: str
    way: str
    seed: int


def plans(ways: Sequence[str], spans: int, seed: int) -> list[Plan]:
    """Family by family in turn, the same spans in every way."""
    families = list(FAMILIES)
    return [
        Plan(families[i % len(families)], way, 100_000 * seed + i)
        for i in range(spans)
        for way in ways
    ]


def run(plan: Plan) -> Trial:
    """Answer one span and build the answer; nothing hidden reaches the program."""
    number = list(FAMILIES).index(plan.family)
    on_paper, in_steel, on_site = np.random.default_rng((plan.seed, number)).spawn(3)
    job = described(plan.family, on_paper)
    truth = hidden(job, plan.way, in_steel)
    excitations = _machine(truth, job, on_paper)
    evidence = tapped(job, truth, on_site)
    goal = Goal(up_to_hz=job.up_to_hz, allow=BUILT)
    blank = Trial(plan.family, plan.way, plan.seed, len(evidence.modes))
    if not evidence.modes or not excitations:
        return _with(blank, refused="nothing was measured")
    started = time.process_time()
    try:
        found = match(job.span, job.tapped, job.running, evidence, up_to_hz=job.up_to_hz)
    except Refusal as refusal:
        return _with(blank, refused=str(refusal))
    middle = time.process_time()
    answer = detune(job.span, job.tapped, job.running, found, excitations, goal)
    ended = time.process_time()
    as_is = truth.running_modes(truth.span, job.up_to_hz)
    return _with(
        blank,
        covered_now=covered(answer.modes, as_is),
        effective=found.ensemble.effective_size,
        match_s=middle - started,
        detune_s=ended - middle,
        usual_kept=_usual(job, truth, evidence, answer.bands, goal, on_site.spawn(1)[0]),
        **_first_fix(job, truth, answer, goal, on_site),
    )


def _with(trial: Trial, **values: object) -> Trial:
    return replace(trial, **values)  # type: ignore[arg-type]


def _machine(truth: Truth, job: Described, rng: Draw) -> tuple[Excitation, ...]:
    """On one of the first three modes: steady, over a range, or with its second order."""
    modes = truth.running_modes(truth.span, job.up_to_hz)[:3]
    if not modes:
        return ()
    at = modes[rng.integers(len(modes))].frequency_hz * (1 + NEAREST_HZ * rng.standard_normal())
    how = rng.choice(3, p=[0.6, 0.25, 0.15])
    wide = 0.04 if how == 1 else 0.01
    orders = (1.0, 2.0) if how == 2 else (1.0,)
    return (Excitation("machine", ((1 - wide) * at, (1 + wide) * at), orders),)


def _first_fix(
    job: Described, truth: Truth, answer: Detuning, goal: Goal, rng: Draw
) -> dict[str, object]:
    if not answer.fixes:
        return {}
    first = answer.fixes[0]
    after = truth.running_modes(installed(first.change, truth, job, rng), job.up_to_hz)
    return {
        "promised": first.chance,
        "kept": clear(after, answer.bands, goal),
        "kind": first.kind,
        "covered": covered(first.modes_after, after),
        "error": errors(first.modes_after, after),
    }


def clear(modes: Sequence[ExactMode], forbidden: Sequence[Band], goal: Goal) -> bool:
    """Whether every mode up to the limit lies outside every band."""
    frequency = np.array([m.frequency_hz for m in modes if m.frequency_hz <= goal.up_to_hz])
    return bool(clear_of_all(frequency, forbidden).all())


def paired(
    stated: Sequence[JudgedMode], true: Sequence[ExactMode]
) -> list[tuple[JudgedMode | None, ExactMode]]:
    """The first true modes with what was stated of them: the same in turn of their direction."""
    found = []
    for i, mode in enumerate(true[:FIRST]):
        turn = sum(m.direction == mode.direction for m in true[:i])
        alike = sorted(
            (s for s in stated if s.direction == mode.direction), key=lambda s: s.median_hz
        )
        found.append((alike[turn] if turn < len(alike) else None, mode))
    return found


def covered(stated: Sequence[JudgedMode], true: Sequence[ExactMode]) -> tuple[bool, ...]:
    """Whether the stated intervals hold the first true modes."""
    return tuple(
        said is not None and bool(said.low_hz <= mode.frequency_hz <= said.high_hz)
        for said, mode in paired(stated, true)
    )


def errors(stated: Sequence[JudgedMode], true: Sequence[ExactMode]) -> tuple[float, ...]:
    """Of the medians, relative, where the mode was stated."""
    return tuple(
        float(said.median_hz / mode.frequency_hz - 1)
        for said, mode in paired(stated, true)
        if said is not None
    )


def _usual(
    job: Described, truth: Truth, evidence: Evidence, forbidden: tuple[Band, ...], goal: Goal,
    rng: Draw,
) -> tuple[tuple[str, bool], ...]:  # fmt: skip
    scale = usual.measured_over_computed(job, evidence)
    found = []
    for name, factor in ((NOMINAL, 1.0), (SCALED, scale)):
        change = usual.smallest(job, forbidden, goal, factor)
        if change is not None:
            found.append((name, _holds(change, truth, job, forbidden, goal, rng)))
    return tuple(found)


def _holds(
    change: Change, truth: Truth, job: Described, forbidden: Sequence[Band], goal: Goal, rng: Draw
) -> bool:
    span: Span = installed(change, truth, job, rng)
    return clear(truth.running_modes(span, job.up_to_hz), forbidden, goal)
