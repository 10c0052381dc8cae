"""Recordings of a job, loaded and read one by one."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import partial
from pathlib import Path

from fieldkit.detune.excitation import Excitation, bands, excitation_band
from fieldkit.errors import InputError
from fieldkit.job.document import Job, RecordingEntry
from fieldkit.progress import Progress
from fieldkit.signal.modes import ModeEstimate, TapRecord
from fieldkit.signal.objections import Missing
from fieldkit.signal.recording import Channel, Recording, channel_signal, check_channel
from fieldkit.signal.running import RunningPicture, read_running
from fieldkit.signal.source import RecordingSource, as_far_as_readable, held, open_recording
from fieldkit.signal.spectrum import Spectrum, tap_spectrum
from fieldkit.signal.taps import TapSearch, cut, find_taps, longest_whole
from fieldkit.workup.beside import Beside, beside, described, without_set_aside
from fieldkit.workup.hammer import HammerReading, with_hammer
from fieldkit.workup.limits import UP_TO_HZ
from fieldkit.workup.long_recordings import (
    FoundRunning,
    FoundTaps,
    Meaning,
    running_of_long,
    taps_of_long,
)
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
        part = progress.within(0.5 * i / len(entries), 0.5 * (i + 1) / len(entries))
        found.append(read_tap(entry, part))
    return tuple(found)


def read_tap(entry: RecordingEntry, progress: Progress | None = None) -> TapReading:
    """One tap recording: its blows, which of them are usable, and their mean spectrum."""
    source = _opened(entry)
    known = beside(entry.path, source.without_samples())
    quantity, scale = meaning = _meaning(entry, source.channels)
    if source.long:
        work = partial(
            taps_of_long,
            entry=entry,
            known=known,
            meaning=meaning,
            progress=progress or Progress(),
        )
        found, source = as_far_as_readable(source, work)
    else:
        source = held(source.loaded())
        found = _taps_of_short(source.loaded(), entry, known, meaning)
    spectrum = None
    if found.records:
        spectrum = tap_spectrum(
            [record.samples for record in found.records],
            source.rate_hz,
            quantity=quantity,
            scale=scale,
        )
    return TapReading(
        entry.path.name,
        source.rate_hz,
        len(source.channels),
        source.duration_s,
        found.search,
        found.records,
        spectrum,
        entry,
        (*source.notes, *known.notes, *found.notes),
        found.hammer,
    )


def _taps_of_short(
    recording: Recording, entry: RecordingEntry, known: Beside, meaning: Meaning
) -> FoundTaps:
    """The taps of a recording that is held in memory."""
    signal = channel_signal(recording, entry.channel)
    rate_hz = recording.rate_hz
    search = find_taps(signal, rate_hz, full_scale=recording.full_scale, gaps=known.gaps)
    search = without_set_aside(search, known.set_aside, rate_hz)
    search, hammer = with_hammer(entry, recording, signal, search, *meaning)
    records = cut(signal, rate_hz, search, source=entry.path.name)
    return FoundTaps(search, records, hammer)


def running_readings(job: Job, progress: Progress) -> tuple[RunningReading, ...]:
    """All running recordings of a job."""
    entries = job.recordings_of("running")
    found = []
    for i, entry in enumerate(entries):
        progress.step(f"reading {entry.path.name}", i / len(entries))
        part = progress.within(i / len(entries), (i + 1) / len(entries))
        found.append(read_running_entry(entry, job.goal.up_to_hz, part))
    return tuple(found)


def read_running_entry(
    entry: RecordingEntry, up_to_hz: float = UP_TO_HZ, progress: Progress | None = None
) -> RunningReading:
    """One running recording: its lines, its level, and the modes up to a frequency."""
    source = _opened(entry)
    known = beside(entry.path, source.without_samples())
    meaning = _meaning(entry, source.channels)
    if source.long:
        work = partial(
            running_of_long,
            entry=entry,
            gaps=known.gaps,
            meaning=meaning,
            up_to_hz=up_to_hz,
            progress=progress or Progress(),
        )
        found, source = as_far_as_readable(source, work)
    else:
        source = held(source.loaded())
        found = _running_of_short(source.loaded(), entry, known.gaps, meaning, up_to_hz)
    return RunningReading(
        entry.path.name,
        source.rate_hz,
        len(source.channels),
        source.duration_s,
        found.picture,
        entry,
        (*source.notes, *known.notes, *_shortened(known.gaps, source), *found.notes),
        found.modes,
        found.no_modes,
    )


def _running_of_short(
    recording: Recording,
    entry: RecordingEntry,
    gaps: Sequence[Missing],
    meaning: Meaning,
    up_to_hz: float,
) -> FoundRunning:
    """What a recording that is held in memory shows."""
    signal = channel_signal(recording, entry.channel)
    whole = signal[slice(*longest_whole((0, len(signal)), gaps))]
    quantity, scale = meaning
    picture = read_running(
        whole,
        recording.rate_hz,
        quantity=quantity,
        scale=scale,
        full_scale=recording.full_scale,
    )
    found = running_modes(whole, recording.rate_hz, picture.lines, entry, up_to_hz)
    return FoundRunning(picture, *found)


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


def _shortened(gaps: Sequence[Missing], source: RecordingSource) -> tuple[str, ...]:
    first, end = longest_whole((0, source.frames), gaps)
    if end - first == source.frames:
        return ()
    from_s, to_s = first / source.rate_hz, end / source.rate_hz
    return (f"read from {from_s:.2f} s to {to_s:.2f} s, the longest stretch without a gap",)


def _opened(entry: RecordingEntry) -> RecordingSource:
    source = open_recording(entry.path, rate_hz=entry.rate_hz)
    try:
        check_channel(entry.channel, len(source.channels), entry.path)
    except InputError as error:
        raise error.at(file=entry.path) from error
    return source


def _meaning(entry: RecordingEntry, channels: Sequence[Channel]) -> Meaning:
    """Quantity and scale of a channel: the job's word first, then the file's own."""
    channel = channels[entry.channel - 1]
    if entry.scale is None and channel.scale is not None:
        return channel.quantity, channel.scale
    return entry.quantity, entry.scale
