"""The whole chain for one job: load, evidence, span, match, detune."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from itertools import groupby
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.evidence import Evidence
from fieldkit.detune.excitation import Excitation
from fieldkit.detune.match import Match, match
from fieldkit.detune.rank import detune
from fieldkit.detune.verdict import Detuning
from fieldkit.errors import InputError, Refusal
from fieldkit.job.document import Job, RecordingEntry
from fieldkit.progress import Progress
from fieldkit.signal.modes import MeasuredMode, ModeEstimate, TapRecord, Tone, estimate_modes
from fieldkit.signal.recording import Recording, channel_signal, load
from fieldkit.signal.running import RunningPicture, read_running
from fieldkit.signal.spectrum import Spectrum, tap_spectrum
from fieldkit.signal.taps import TapSearch, cut, find_taps
from fieldkit.span.handbook import HandbookEstimate, estimate
from fieldkit.span.layout import Span, State
from fieldkit.span.modes import Mode, free_directions, span_modes
from fieldkit.span.static import WeightAnswer, weight_answer

LEAST_HZ = 2.0
NYQUIST_SHARE = 0.4
"""Highest frequency analysed, as a share of the sampling rate."""


@dataclass(frozen=True)
class TapReading:
    """One tap recording, read."""

    file: str
    rate_hz: float
    channels: int
    duration_s: float
    search: TapSearch
    records: tuple[TapRecord, ...]
    """The usable taps, cut out."""
    spectrum: Spectrum | None
    """Averaged over its usable taps; None when it has none."""
    entry: RecordingEntry
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class RunningReading:
    """One running recording, read."""

    file: str
    rate_hz: float
    channels: int
    duration_s: float
    picture: RunningPicture
    entry: RecordingEntry
    notes: tuple[str, ...] = ()


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
    work = Workup(job, (), Evidence(job.measured), (), None, None)
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
    return replace(work, running=running_readings(work.job, progress))


def _with_states(work: Workup, progress: Progress) -> Workup:
    return replace(work, states=state_modes(work.job, progress))


def _with_match(work: Workup, progress: Progress) -> Workup:
    return replace(work, match=matching(work.job, work.evidence, work.states, progress))


def _with_detuning(work: Workup, progress: Progress) -> Workup:
    return replace(work, detuning=detuning(work.job, work.evidence, work.match, progress))


STEPS: tuple[tuple[str, float, float, Callable[[Workup, Progress], Workup]], ...] = (
    ("tap", 0.0, 0.35, _with_taps),
    ("running", 0.35, 0.45, _with_running),
    ("span", 0.45, 0.5, _with_states),
    ("match", 0.5, 0.75, _with_match),
    ("detune", 0.75, 1.0, _with_detuning),
)
"""The steps in the order of the work, each with its share of the progress."""


def gather(job: Job, progress: Progress) -> tuple[tuple[TapReading, ...], Evidence]:
    """All tap recordings of a job, and the measured modes in them and typed by hand."""
    readings = tap_readings(job.recordings_of("tap"), progress)
    return readings, evidence_from(readings, job, progress)


def tap_readings(entries: Sequence[RecordingEntry], progress: Progress) -> tuple[TapReading, ...]:
    """Load recordings and find their taps."""
    found = []
    for i, entry in enumerate(entries):
        progress.step(f"reading {entry.path.name}", 0.5 * i / len(entries))
        found.append(read_tap(entry))
    return tuple(found)


def read_tap(entry: RecordingEntry) -> TapReading:
    """One tap recording: its blows, which of them are usable, and their mean spectrum."""
    recording, signal = _channel(entry)
    search = find_taps(signal, recording.rate_hz, full_scale=recording.full_scale)
    records = cut(signal, recording.rate_hz, search, source=entry.path.name)
    spectrum = None
    if records:
        quantity, scale = _meaning(entry, recording)
        spectrum = tap_spectrum(
            [record.samples for record in records],
            recording.rate_hz,
            quantity=quantity,
            scale=scale,
        )
    return TapReading(
        entry.path.name,
        recording.rate_hz,
        len(recording.channels),
        recording.duration_s,
        search,
        records,
        spectrum,
        entry,
        recording.notes,
    )


def evidence_from(
    readings: Sequence[TapReading], job: Job | None, progress: Progress, up_to_hz: float = 200.0
) -> Evidence:
    """Measured modes of all usable taps, direction by direction, and the typed ones.

    Raises Refusal where there are recordings but no usable tap and nothing typed.
    """
    up_to_hz = job.goal.up_to_hz if job else up_to_hz
    typed = job.measured if job else ()
    usable = [reading for reading in readings if reading.records]
    if readings and not usable and not typed:
        raise Refusal(
            f"no usable tap in {', '.join(reading.file for reading in readings)}"
            f" ({_why_unusable(readings)})",
            "record three taps or more, each left to ring out, a quiet second before the first",
        )
    estimates: list[tuple[GroupKey, ModeEstimate]] = []
    for key, group in groupby(sorted(usable, key=_group_key), key=_group_key):
        progress.step("finding modes", 0.5 + 0.5 * len(estimates) / len(usable))
        estimates.append((key, _estimate(list(group), up_to_hz)))
    return _combined(estimates, typed)


def _why_unusable(readings: Sequence[TapReading]) -> str:
    reasons = [reason for r in readings for tap in r.search.taps for reason in tap.reasons]
    return "; ".join(dict.fromkeys(reasons)) or "no blow stands out of the noise"


GroupKey = tuple[str, str, float]


def _group_key(reading: TapReading) -> GroupKey:
    """Taps of one state, direction and sensor place are estimated together."""
    entry = reading.entry
    return entry.state, entry.direction or "", -1.0 if entry.at_m is None else entry.at_m


def _estimate(group: Sequence[TapReading], up_to_hz: float) -> ModeEstimate:
    records = [record for reading in group for record in reading.records]
    highest = min(NYQUIST_SHARE * record.rate_hz for record in records)
    return estimate_modes(records, low_hz=LEAST_HZ, high_hz=min(up_to_hz, highest))


def _combined(
    estimates: Sequence[tuple[GroupKey, ModeEstimate]], typed: Sequence[MeasuredMode]
) -> Evidence:
    modes = list(typed)
    for (state, direction, at_m), found in estimates:
        modes += [
            replace(
                mode,
                state=state,
                direction=direction or None,
                at_m=None if at_m < 0 else at_m,
            )
            for mode in found.modes
        ]
    return Evidence(
        modes=tuple(sorted(modes, key=lambda mode: mode.frequency_hz)),
        tones=_merged_tones([tone for _, found in estimates for tone in found.tones]),
        refused=tuple(
            sorted(
                (refused for _, found in estimates for refused in found.refused),
                key=lambda refused: refused.frequency_hz,
            )
        ),
        warnings=tuple(dict.fromkeys(w for _, found in estimates for w in found.warnings)),
    )


def _merged_tones(tones: Sequence[Tone]) -> tuple[Tone, ...]:
    """Tones heard in several directions, once each, as strong as the strongest."""
    merged: list[Tone] = []
    for tone in sorted(tones, key=lambda tone: tone.frequency_hz):
        if merged and abs(tone.frequency_hz - merged[-1].frequency_hz) < 0.1:
            merged[-1] = max(merged[-1], tone, key=lambda t: t.strength)
        else:
            merged.append(tone)
    return tuple(merged)


def running_readings(job: Job, progress: Progress) -> tuple[RunningReading, ...]:
    """All running recordings of a job."""
    entries = job.recordings_of("running")
    found = []
    for i, entry in enumerate(entries):
        progress.step(f"reading {entry.path.name}", i / len(entries))
        found.append(read_running_entry(entry))
    return tuple(found)


def read_running_entry(entry: RecordingEntry) -> RunningReading:
    """One running recording: its lines and its level."""
    recording, signal = _channel(entry)
    quantity, scale = _meaning(entry, recording)
    picture = read_running(
        signal,
        recording.rate_hz,
        quantity=quantity,
        scale=scale,
        full_scale=recording.full_scale,
    )
    return RunningReading(
        entry.path.name,
        recording.rate_hz,
        len(recording.channels),
        recording.duration_s,
        picture,
        entry,
        recording.notes,
    )


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
    """The ensemble that agrees with the evidence."""
    handbook = states[0].handbook if states else None
    return match(
        job.span,
        job.tapped,
        job.running,
        evidence,
        up_to_hz=job.goal.up_to_hz,
        handbook_hz=handbook.frequency_hz if handbook else None,
        progress=progress,
    )


def detuning(job: Job, evidence: Evidence, matched: Match | None, progress: Progress) -> Detuning:
    """Ranked changes; InputError where the job names no excitation.

    Without any measured mode the ranking rests on the prior and says so; a measurement that the
    model cannot explain is a Refusal, since no promise can be built on either of them.
    """
    if matched is None and evidence.modes:
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


def _channel(entry: RecordingEntry) -> tuple[Recording, NDArray[np.float64]]:
    recording = load(entry.path, rate_hz=entry.rate_hz)
    try:
        return recording, channel_signal(recording, entry.channel)
    except InputError as error:
        raise error.at(file=entry.path) from error


def _meaning(entry: RecordingEntry, recording: Recording) -> tuple[str | None, float | None]:
    """Quantity and scale of a channel: the job's word first, then the file's own."""
    channel = recording.channels[entry.channel - 1]
    if entry.scale is None and channel.scale is not None:
        return channel.quantity, channel.scale
    return entry.quantity, entry.scale


def entry_for(
    path: Path, kind: str, channel: int = 1, rate_hz: float | None = None
) -> RecordingEntry:
    """A recording that no job describes: uncalibrated, direction unknown."""
    return RecordingEntry(path, kind, kind.replace("tap", "tapped"), channel, rate_hz=rate_hz)


def excitation_of(
    frequency_hz: float, excitations: Sequence[Excitation], tolerance: float = 0.02
) -> str | None:
    """Name of the excitation whose range holds a running line, within a relative tolerance."""
    for excitation in excitations:
        for name, low, high in excitation.ranges():
            if low * (1 - tolerance) <= frequency_hz <= high * (1 + tolerance):
                return name
    return None


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
