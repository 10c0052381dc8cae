"""The steps for one job, one after the other, with what each of them gave."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

from fieldkit.detune.evidence import Evidence
from fieldkit.detune.match import match
from fieldkit.detune.matched import Match
from fieldkit.detune.rank import detune
from fieldkit.detune.verdict import Detuning
from fieldkit.errors import InputError, Refusal
from fieldkit.job.document import Job
from fieldkit.job.schema import require_excitation
from fieldkit.progress import Progress
from fieldkit.span.handbook import HandbookEstimate, estimate
from fieldkit.span.layout import Span, State
from fieldkit.span.modes import Mode, free_directions, span_modes
from fieldkit.span.static import WeightAnswer, weight_answer
from fieldkit.workup.beside import SIMULATED
from fieldkit.workup.evidence import evidence_from, with_running_modes
from fieldkit.workup.findings import Findings, findings, with_next_blow
from fieldkit.workup.readings import RunningReading, TapReading, running_readings, tap_readings
from fieldkit.workup.simulated import simulated_files


@dataclass(frozen=True)
class StateModes:
    """Computed modes and handbook estimate of one state, unknowns at their prior medians."""

    state: str
    modes: tuple[Mode, ...]
    handbook: HandbookEstimate | None
    handbook_refused: str = ""
    """Why there is no handbook estimate."""


@dataclass(frozen=True)
class StepRefusal:
    """Why one step of the work has no answer."""

    step: str
    """``tap``, ``running``, ``span``, ``match`` or ``detune``."""
    reason: str
    bad_input: bool = False
    """Whether the input is at fault, not what it can answer."""


@dataclass(frozen=True)
class Workup:
    """Everything computed for one job; a part that could not be had is missing, with its reason."""

    job: Job
    taps: tuple[TapReading, ...]
    evidence: Evidence
    running: tuple[RunningReading, ...]
    match: Match | None
    detuning: Detuning | None
    refused: tuple[StepRefusal, ...] = ()
    warnings: tuple[str, ...] = ()
    states: tuple[StateModes, ...] = ()
    done: tuple[str, ...] = ()
    """Steps that were gone through, with or without an answer."""
    findings: Findings | None = None
    """Resonance or forced, severity, the next blow, contradictions."""
    simulated: tuple[str, ...] = ()
    """Recordings that the practice rig made: nothing that rests on them was measured."""

    def refusals(self, step: str) -> tuple[str, ...]:
        """Why a step has no answer; empty when it has one."""
        return tuple(refusal.reason for refusal in self.refused if refusal.step == step)


def run(
    job: Job,
    progress: Progress | None = None,
    on_part: Callable[[Workup], object] | None = None,
) -> Workup:
    """Everything that can be computed for a job.

    ``on_part`` gets the workup as far as it is after each step. Refusals and bad recordings become
    entries of ``refused``; Cancelled passes through.
    """
    progress = progress or Progress()
    simulated = simulated_files(job.recordings)
    work = Workup(job, (), Evidence(job.measured), (), None, None, simulated=simulated)
    for step, start, end, add in STEPS:
        progress.step(step, start)
        try:
            work = add(work, progress.within(start, end))
        except (Refusal, InputError) as error:
            refusal = StepRefusal(step, str(error), isinstance(error, InputError))
            work = replace(work, refused=(*work.refused, refusal))
        work = replace(work, done=(*work.done, step))
        if on_part is not None:
            on_part(work)
    return work


def _with_taps(work: Workup, progress: Progress) -> Workup:
    taps, evidence = gather(work.job, progress)
    return replace(work, taps=taps, evidence=evidence, warnings=evidence.warnings)


def _with_running(work: Workup, progress: Progress) -> Workup:
    running = running_readings(work.job, progress)
    evidence = with_running_modes(work.evidence, running)
    return replace(work, running=running, evidence=evidence, warnings=evidence.warnings)


def _with_states(work: Workup, progress: Progress) -> Workup:
    return replace(work, states=state_modes(work.job, progress))


def _with_match(work: Workup, progress: Progress) -> Workup:
    return replace(work, match=matching(work.job, work.evidence, work.states, progress))


def _with_detuning(work: Workup, progress: Progress) -> Workup:
    return replace(work, detuning=detuning(work.job, work.evidence, work.match, progress))


def _with_findings(work: Workup, progress: Progress) -> Workup:
    found = findings(work.job, work.evidence, work.running, work.match, work.detuning, progress)
    matched = with_next_blow(work.match, found) if work.match else None
    return replace(work, findings=found, match=matched)


STEPS: tuple[tuple[str, float, float, Callable[[Workup, Progress], Workup]], ...] = (
    ("tap", 0.0, 0.35, _with_taps),
    ("running", 0.35, 0.45, _with_running),
    ("span", 0.45, 0.5, _with_states),
    ("match", 0.5, 0.75, _with_match),
    ("detune", 0.75, 0.97, _with_detuning),
    ("findings", 0.97, 1.0, _with_findings),
)
"""The steps in the order of the work, each with its share of the progress."""


def gather(job: Job, progress: Progress) -> tuple[tuple[TapReading, ...], Evidence]:
    """All tap recordings of a job, and the measured modes in them and typed by hand."""
    readings = tap_readings(job.recordings_of("tap"), progress)
    return readings, evidence_from(readings, job, progress)


def measured(job: Job, progress: Progress) -> Evidence:
    """Everything measured on a job: taps, typed peaks, and what running recordings add.

    A running recording that cannot be read is left out and named in the warnings. Raises Refusal
    where taps cannot be used and nothing else was measured.
    """
    try:
        evidence, refusal = gather(job, progress)[1], None
    except Refusal as error:
        evidence, refusal = Evidence(job.measured), error
    try:
        evidence = with_running_modes(evidence, running_readings(job, progress))
    except (Refusal, InputError) as error:
        left_out = f"a running recording was left out: {error}"
        evidence = replace(evidence, warnings=(*evidence.warnings, left_out))
    if refusal is not None and not evidence.modes:
        raise refusal
    return evidence


def state_modes(job: Job, progress: Progress) -> tuple[StateModes, ...]:
    """Computed modes and handbook estimates, tapped then running."""
    found = []
    for i, state in enumerate((job.tapped, job.running)):
        progress.step(f"solving the span, {state.name}", i / 2)
        found.append(one_state(job.span, state, job.goal.up_to_hz))
    return tuple(found)


def one_state(span: Span, state: State, up_to_hz: float) -> StateModes:
    """Modes and handbook estimate of one state."""
    modes = span_modes(span, state, up_to_hz)
    try:
        return StateModes(state.name, modes, estimate(span, state))
    except Refusal as refusal:
        return StateModes(state.name, modes, None, str(refusal))


def matching(
    job: Job, evidence: Evidence, states: Sequence[StateModes], progress: Progress
) -> Match:
    """The ensemble that agrees with the evidence; warns where that was simulated."""
    handbook = states[0].handbook if states else None
    found = match(
        job.span,
        job.tapped,
        job.running,
        evidence,
        up_to_hz=job.goal.up_to_hz,
        handbook_hz=handbook.frequency_hz if handbook else None,
        progress=progress,
    )
    simulated = [warning for warning in evidence.warnings if f": {SIMULATED}" in warning]
    return replace(found, warnings=(*simulated, *found.warnings))


def detuning(job: Job, evidence: Evidence, matched: Match | None, progress: Progress) -> Detuning:
    """Ranked changes; InputError where the job names no excitation.

    Without any tapped or typed mode that the model explains the ranking rests on the prior and
    says so; a tap that the model cannot explain is a Refusal, since no promise can be built on
    either of them.
    """
    require_excitation(job)
    if matched is None and evidence.firm:
        raise Refusal(
            "no change can be promised while the model does not explain the measurement",
            "settle the match first",
        )
    return detune(
        job.span,
        job.tapped,
        job.running,
        matched,
        job.excitations,
        job.goal,
        job.units,
        progress,
    )


def at_rest(job: Job) -> tuple[dict[str, WeightAnswer], tuple[str, ...]]:
    """Sag and support loads by state, and what the span leaves open, in words for the user."""
    found: dict[str, WeightAnswer] = {}
    notes: list[str] = []
    free = free_directions(job.span)
    if free:
        notes.append(
            f"no support holds the span along {' and '.join(free)}: it is free to move that way, "
            "and only the modes that remain are shown"
        )
    for state in (job.tapped, job.running):
        try:
            found[state.name] = weight_answer(job.span, state)
        except Refusal as refusal:
            notes.append(str(refusal))
    return found, tuple(dict.fromkeys(notes))
