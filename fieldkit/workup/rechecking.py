"""A recheck of one job: what was recorded after the change, held against the promise."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from fieldkit.detune.evidence import Evidence
from fieldkit.detune.rank import afresh, judged_change
from fieldkit.detune.recheck import Question, recheck
from fieldkit.detune.recheck_answer import Recheck
from fieldkit.detune.recheck_change import difference
from fieldkit.detune.verdict import Verdict
from fieldkit.errors import InputError, Refusal
from fieldkit.job.document import Job, RecordingEntry
from fieldkit.progress import Progress
from fieldkit.span.layout import State
from fieldkit.workup.chain import Workup
from fieldkit.workup.chance import search_of
from fieldkit.workup.evidence import evidence_from, with_running_modes
from fieldkit.workup.readings import read_running_entry, tap_readings
from fieldkit.workup.retaps import Retaps


@dataclass(frozen=True)
class Rechecked:
    """The answer with what it was worked out from."""

    work: Workup
    """Of the job before the change."""
    fix: Verdict
    retaps: Retaps
    state: State
    answer: Recheck

    @property
    def entries(self) -> tuple[RecordingEntry, ...]:
        """Every recording it rests on."""
        return (*self.work.job.recordings, *self.retaps.entries)


def promised_fix(work: Workup, number: int = 1) -> Verdict:
    """The ranked change of a number.

    Raises InputError where there is none, or the job's input is bad; Refusal where nothing could
    be promised before.
    """
    if work.detuning is None:
        blocking = [r for r in work.refused if r.step in ("tap", "match", "detune")]
        reasons = "; ".join(r.reason for r in blocking) or "no change was ranked"
        if any(r.bad_input for r in blocking):
            raise InputError(reasons)
        raise Refusal(f"nothing was promised before the change: {reasons}")
    for fix in work.detuning.fixes:
        if fix.rank == number:
            return fix
    count = len(work.detuning.fixes)
    offered = f"give --fix from 1 to {count}" if count else "name the job with --before"
    raise InputError(f"there is no change {number}", offered)


def built_fix(work: Workup, now: Job, progress: Progress) -> Verdict:
    """The change that leads from a job to the one it was built as, judged like a ranked one."""
    job = work.job
    change = difference(job.span, now.span)
    search = afresh(search_of(job, work.match, progress), work.match)
    return replace(judged_change(search, job.tapped, job.running, change, job.units), rank=0)


def rechecked(
    work: Workup, fix: Verdict, found: Retaps, state: State, progress: Progress | None = None
) -> Rechecked:
    """The re-tap held against what a workup promised of a fix.

    ``state`` is how the pipe was when it was recorded again. Raises Refusal where the recordings
    cannot answer and InputError where one cannot be read.
    """
    progress = progress or Progress()
    job = work.job
    evidence = _evidence(found.entries, job, progress.within(0.0, 0.3))
    asked = Question(
        span=job.span,
        tapped=job.tapped,
        running=job.running,
        retapped=state,
        before=work.evidence,
        match=work.match,
        after=evidence,
        change=fix.change,
        chance_before=fix.chance,
        excitations=job.excitations,
        goal=job.goal,
        units=job.units,
    )
    answer = recheck(asked, progress.within(0.3, 1.0))
    told = dict.fromkeys((*found.notes, *answer.warnings))
    return Rechecked(work, fix, found, state, replace(answer, warnings=tuple(told)))


def _evidence(entries: Sequence[RecordingEntry], job: Job, progress: Progress) -> Evidence:
    taps = [entry for entry in entries if entry.kind == "tap"]
    if taps:
        readings = tap_readings(taps, progress)
        return evidence_from(readings, None, progress, job.goal.up_to_hz)
    running = [read_running_entry(e, job.goal.up_to_hz, progress) for e in entries]
    found = with_running_modes(Evidence(), running)
    if not found.modes:
        reasons = dict.fromkeys(r.no_modes for r in running if r.no_modes)
        raise Refusal(
            f"no natural frequency shows while running: {'; '.join(reasons) or 'no peak is sure'}",
            "tap the pipe with the machine stopped, where the taps before the change were made",
        )
    return found
