"""The whole chain for one job: load, evidence, span, match, detune."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from fieldkit.detune.evidence import Evidence
from fieldkit.detune.match import Match
from fieldkit.detune.verdict import Detuning
from fieldkit.job.document import Job, RecordingEntry
from fieldkit.signal.modes import TapRecord
from fieldkit.signal.running import RunningPicture
from fieldkit.signal.spectrum import Spectrum
from fieldkit.signal.taps import TapSearch


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
    entry: RecordingEntry | None
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class RunningReading:
    """One running recording, read."""

    file: str
    rate_hz: float
    channels: int
    duration_s: float
    picture: RunningPicture
    quantity: str | None
    entry: RecordingEntry | None
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class StateModes:
    """Computed modes and handbook estimate of one state, unknowns at their prior medians."""

    state: str
    modes: tuple[object, ...]
    handbook: object


@dataclass(frozen=True)
class Workup:
    """Everything computed for one job; a part that could not be had is None, with its reason."""

    job: Job
    taps: tuple[TapReading, ...]
    evidence: Evidence
    running: tuple[RunningReading, ...]
    match: Match | None
    detuning: Detuning | None
    refused: tuple[str, ...]
    """Why a part is missing, in words for the user."""
    warnings: tuple[str, ...]


def job_directory(job: Job) -> Path:
    """Folder that relative recordings are found in."""
    return job.path.parent if job.path is not None else Path.cwd()
