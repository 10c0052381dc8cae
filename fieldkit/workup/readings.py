"""Recordings of a job, loaded and read one by one."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.excitation import Excitation, bands, excitation_band
from fieldkit.errors import InputError
from fieldkit.job.document import Job, RecordingEntry
from fieldkit.progress import Progress
from fieldkit.signal.modes import ModeEstimate, TapRecord
from fieldkit.signal.recording import Recording, channel_signal, load
from fieldkit.signal.running import RunningPicture, read_running
from fieldkit.signal.spectrum import Spectrum, tap_spectrum
from fieldkit.signal.taps import TapSearch, cut, find_taps, longest_whole
from fieldkit.workup.beside import beside, described
from fieldkit.workup.hammer import HammerReading, with_hammer
from fieldkit.workup.limits import UP_TO_HZ
from fieldkit.workup.running_modes import running_modes


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
    hammer: HammerReading | None = None
    """None where no force was recorded."""


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
    modes: ModeEstimate | None = None
    """Modes that random forces keep stirring; None where the record cannot tell."""
    no_modes: str = ""
    """Why no mode was found."""


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
    quantity, scale = _meaning(entry, recording)
    known = beside(entry.path, recording)
    search = find_taps(signal, recording.rate_hz, full_scale=recording.full_scale, gaps=known.gaps)
    search, hammer = with_hammer(entry, recording, signal, search, quantity, scale)
    records = cut(signal, recording.rate_hz, search, source=entry.path.name)
    spectrum = None
    if records:
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
        (*recording.notes, *known.notes),
        hammer,
    )


def running_readings(job: Job, progress: Progress) -> tuple[RunningReading, ...]:
    """All running recordings of a job."""
    entries = job.recordings_of("running")
    found = []
    for i, entry in enumerate(entries):
        progress.step(f"reading {entry.path.name}", i / len(entries))
        found.append(read_running_entry(entry, job.goal.up_to_hz))
    return tuple(found)


def read_running_entry(entry: RecordingEntry, up_to_hz: float = UP_TO_HZ) -> RunningReading:
    """One running recording: its lines, its level, and the modes up to a frequency."""
    recording, signal = _channel(entry)
    quantity, scale = _meaning(entry, recording)
    known = beside(entry.path, recording)
    first, end = longest_whole((0, len(signal)), known.gaps)
    picture = read_running(
        signal[first:end],
        recording.rate_hz,
        quantity=quantity,
        scale=scale,
        full_scale=recording.full_scale,
    )
    modes, no_modes = running_modes(
        signal[first:end], recording.rate_hz, picture.lines, entry, up_to_hz
    )
    return RunningReading(
        entry.path.name,
        recording.rate_hz,
        len(recording.channels),
        recording.duration_s,
        picture,
        entry,
        (*recording.notes, *known.notes, *_shortened(first, end, recording)),
        modes,
        no_modes,
    )


def entry_for(
    path: Path, kind: str, channel: int = 1, rate_hz: float | None = None
) -> RecordingEntry:
    """A recording that no job describes: its set-up is what stands beside it, or unknown."""
    state = kind.replace("tap", "tapped")
    return described(RecordingEntry(path, kind, state, channel, rate_hz=rate_hz))


def excitation_of(frequency_hz: float, excitations: Sequence[Excitation]) -> str | None:
    """Name of the excitation a running line belongs to."""
    found = excitation_band(frequency_hz, bands(excitations, 0.0))
    return found.name if found else None


def _shortened(first: int, end: int, recording: Recording) -> tuple[str, ...]:
    if end - first == len(recording.samples):
        return ()
    from_s, to_s = first / recording.rate_hz, end / recording.rate_hz
    return (f"read from {from_s:.2f} s to {to_s:.2f} s, the longest stretch without a gap",)


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
