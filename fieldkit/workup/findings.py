"""What taps, running records and the model say together: resonance, doubt, contradictions."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune import judge
from fieldkit.detune.carried_over import clearance, frequencies_after
from fieldkit.detune.contradictions import Contradiction, not_seen, unexplained
from fieldkit.detune.diagnosis import (
    BandCheck,
    Diagnosis,
    diagnose,
    measured_in_bands,
    strong,
    with_stronger,
    worst,
)
from fieldkit.detune.evidence import RUNNING, Evidence
from fieldkit.detune.excitation import bands
from fieldkit.detune.field import Field, field
from fieldkit.detune.known_modes import KnownMode, alike, known_modes
from fieldkit.detune.matched import Match
from fieldkit.detune.next_blow import Blow, Matters, next_blows, sentence
from fieldkit.detune.reduced import build
from fieldkit.detune.unknowns import unknowns_of
from fieldkit.detune.verdict import Detuning, JudgedMode, Verdict
from fieldkit.detune.visible import Followed, follow_modes
from fieldkit.job.document import Job
from fieldkit.progress import Progress
from fieldkit.workup.readings import RunningReading
from fieldkit.workup.severity import Screened, lines_of, screened

Array = NDArray[np.float64]

PRIOR_MEMBERS = 256
SEED = 21
HOPELESS = 0.02
"""A change with a smaller chance is not worth a measurement of its own."""


@dataclass(frozen=True)
class RunningFindings:
    """What one running recording comes to."""

    file: str
    diagnoses: tuple[Diagnosis, ...]
    screened: Screened

    @property
    def top(self) -> Diagnosis | None:
        """The line of this recording to speak of first."""
        return worst(self.diagnoses)


@dataclass(frozen=True)
class Findings:
    """Everything beyond the fit itself."""

    running: tuple[RunningFindings, ...] = ()
    """One for each running recording."""
    band_checks: tuple[BandCheck, ...] = ()
    """Measured modes, as the pipe runs, against the bands with the measured margin."""
    blows: tuple[Blow, ...] = ()
    """Further taps, the most telling first."""
    contradictions: tuple[Contradiction, ...] = ()
    next_measurement: str = ""

    @property
    def top(self) -> Diagnosis | None:
        """The line to speak of first."""
        return worst([one for found in self.running for one in found.diagnoses])


@dataclass(frozen=True)
class Ensembles:
    """The ensemble read in both states."""

    tapped: Followed
    running: Followed
    modes: tuple[JudgedMode, ...]
    """In the running state."""


def findings(
    job: Job,
    evidence: Evidence,
    readings: Sequence[RunningReading],
    matched: Match | None,
    detuning: Detuning | None,
    progress: Progress | None = None,
) -> Findings:
    """Diagnoses, screenings, the next blow and what contradicts the model.

    Where a tap contradicts the model altogether, only what was measured is used.
    """
    progress = progress or Progress()
    progress.step("holding lines against modes", 0.0)
    usable = matched is not None or not evidence.firm
    read = ensembles(job, matched) if usable else None
    known = _known(job, evidence, read, detuning)
    found = Findings(
        running=running_findings(job, readings, known),
        band_checks=measured_in_bands(known, job.excitations, job.goal),
    )
    if read is None:
        return found
    progress.step("looking for the next blow", 0.5)
    pairs = matched.pairs if matched else ()
    blows = _blows(job, read, matched, detuning)
    return replace(
        found,
        blows=blows,
        contradictions=(
            *unexplained(
                matched.unpaired if matched else (), pairs, job.span, job.tapped, job.excitations
            ),
            *(not_seen(read.tapped, job.tapped.name, evidence.modes, pairs) if matched else ()),
        ),
        next_measurement=sentence(blows, job.running.name, job.units),
    )


def running_findings(
    job: Job | None, readings: Sequence[RunningReading], known: Sequence[KnownMode]
) -> tuple[RunningFindings, ...]:
    """Verdict on each strong line, and the screening of each level; without a job no verdicts."""
    lowest_hz = min((mode.hz for mode in known), default=None)
    every = [line for reading in readings for line in lines_of(reading)]
    found = []
    for reading in readings:
        lines = strong(lines_of(reading)) if job else ()
        told = diagnose(lines, known, job.excitations, job.goal) if job else ()
        told = tuple(with_stronger(one, every) for one in told)
        found.append(RunningFindings(reading.file, told, screened(reading, job, lowest_hz)))
    return tuple(found)


def ensembles(job: Job, matched: Match | None) -> Ensembles:
    """The members of a match, or of the prior where nothing was measured, in both states."""
    states = (job.tapped, job.running)
    unknowns = unknowns_of(job.span, states)
    z = (
        matched.ensemble.standard
        if matched
        else np.random.default_rng(SEED).standard_normal((PRIOR_MEMBERS, len(unknowns)))
    )
    tapped, running = (
        field(job.span, build(job.span, state, unknowns, job.goal.up_to_hz), z) for state in states
    )
    up_to_hz = job.goal.up_to_hz
    return Ensembles(
        follow_modes(tapped, up_to_hz), follow_modes(running, up_to_hz), _judged(job, running)
    )


def _judged(job: Job, running: Field) -> tuple[JudgedMode, ...]:
    """The modes as they are, scaled to a full re-solve as those of the ranking are."""
    up_to_hz = job.goal.up_to_hz
    exact = judge.resolve(running, job.span, job.running, None, 1.3 * up_to_hz)
    spectrum, _ = judge.corrected(judge.now(running, up_to_hz), running, exact, up_to_hz)
    return judge.judged_modes(spectrum, bands(job.excitations, job.goal.margin), up_to_hz)


def _known(
    job: Job, evidence: Evidence, read: Ensembles | None, detuning: Detuning | None
) -> tuple[KnownMode, ...]:
    computed = detuning.modes if detuning else read.modes if read else ()
    return known_modes(evidence.modes, computed, job.tapped, job.running)


def _blows(
    job: Job, read: Ensembles, matched: Match | None, detuning: Detuning | None
) -> tuple[Blow, ...]:
    same = alike(job.tapped, job.running)
    watched = [(job.tapped.name, read.tapped)]
    if not same:
        watched.append((job.running.name, read.running))
    seen = [
        (job.tapped.name if same else pair.measured.state, pair.mode)
        for pair in (matched.pairs if matched else ())
        if pair.measured.source != RUNNING
    ]
    reach = [job.goal.may_attach(float(at_m)) for at_m in read.tapped.field.station_m]
    return next_blows(watched, seen, _matters(job, read, detuning), reach)


def _matters(job: Job, read: Ensembles, detuning: Detuning | None) -> Matters:
    """The best change where none is sure enough, else the frequencies as the pipe runs."""
    best = _doubtful_change(job, detuning)
    if best is not None and detuning is not None:
        z = read.running.field.z
        states = (job.tapped, job.running)
        hz = frequencies_after(job.span, states, z, best.change, job.goal.up_to_hz)
        margin = clearance(hz, detuning.bands, job.goal.up_to_hz)
        if np.isfinite(margin).all():
            return Matters(margin[:, None], f"how far change {best.rank} clears the bands", True)
    return Matters(
        np.log(read.running.frequency_hz), "the natural frequencies in the running state"
    )


def _doubtful_change(job: Job, detuning: Detuning | None) -> Verdict | None:
    if detuning is None or detuning.chance_now >= job.goal.chance:
        return None
    best = max(detuning.fixes, key=lambda fix: fix.chance, default=None)
    if best is None or not HOPELESS < best.chance < job.goal.chance:
        return None
    return best


def with_next_blow(matched: Match, found: Findings) -> Match:
    """The match with the measurement that the ensemble asks for."""
    if not found.next_measurement:
        return matched
    return replace(matched, next_measurement=found.next_measurement)
