"""Recordings too long for memory: their taps, or what they hold while running."""

from __future__ import annotations

from collections.abc import Sequence
from contextlib import ExitStack
from dataclasses import dataclass, replace

from fieldkit.errors import InputError
from fieldkit.job.document import RecordingEntry
from fieldkit.progress import Progress
from fieldkit.signal.long_decimation import decimated
from fieldkit.signal.long_running import read_running_in, what_was_read
from fieldkit.signal.long_taps import cut_from, find_taps_in, spread, what_was_cut
from fieldkit.signal.modes import ModeEstimate, TapRecord
from fieldkit.signal.objections import Missing
from fieldkit.signal.running import RunningPicture
from fieldkit.signal.source import RecordingSource
from fieldkit.signal.steady_lines import RunningLine
from fieldkit.signal.taps import TapSearch, longest_whole
from fieldkit.workup.beside import Beside, without_set_aside
from fieldkit.workup.hammer import HammerReading, TwoChannels, read_hammer
from fieldkit.workup.running_modes import LONGEST_S, running_modes

Meaning = tuple[str | None, float | None]
"""Quantity of a channel, and SI units per unit of sample."""

_RATE_OVER_HIGHEST = 12.0
_KEPT_OVER_HIGHEST = 2.0
_MOST_SAMPLES = 3_000_000
_PICTURE = 0.9


@dataclass(frozen=True)
class FoundTaps:
    """What one tap recording gives."""

    search: TapSearch
    records: tuple[TapRecord, ...]
    hammer: HammerReading | None
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class FoundRunning:
    """What one running recording gives."""

    picture: RunningPicture
    modes: ModeEstimate | None
    no_modes: str
    notes: tuple[str, ...] = ()


def taps_of_long(
    source: RecordingSource,
    entry: RecordingEntry,
    known: Beside,
    meaning: Meaning,
    progress: Progress,
) -> FoundTaps:
    """All blows of a long recording, and the decays that modes are estimated from."""
    search = find_taps_in(source, entry.channel, gaps=known.gaps, progress=progress)
    search = without_set_aside(search, known.set_aside, source.rate_hz)
    search, hammer = _with_hammer(source, entry, search, meaning)
    records = cut_from(source, entry.channel, search, entry.path.name)
    return FoundTaps(search, records, hammer, what_was_cut(search, records))


def running_of_long(
    source: RecordingSource,
    entry: RecordingEntry,
    gaps: Sequence[Missing],
    meaning: Meaning,
    up_to_hz: float,
    progress: Progress,
) -> FoundRunning:
    """Spectrum, lines and level over the longest stretch without a gap, and modes from a part."""
    whole = source.part(*longest_whole((0, source.frames), gaps))
    quantity, scale = meaning
    picture = read_running_in(
        whole,
        entry.channel,
        quantity=quantity,
        scale=scale,
        progress=progress.within(0, _PICTURE),
    )
    modes, no_modes, from_what = _modes_of_long(
        whole, entry, picture.lines, up_to_hz, progress.within(_PICTURE, 1)
    )
    return FoundRunning(picture, modes, no_modes, (what_was_read(whole), from_what))


def _modes_of_long(
    source: RecordingSource,
    entry: RecordingEntry,
    lines: Sequence[RunningLine],
    up_to_hz: float,
    progress: Progress,
) -> tuple[ModeEstimate | None, str, str]:
    """Modes from the middle of a recording, or why there are none, and which part was used."""
    wanted_hz = min(_RATE_OVER_HIGHEST * up_to_hz, source.rate_hz)
    used = min(int(LONGEST_S * source.rate_hz), source.frames)
    used = min(used, int(_MOST_SAMPLES * max(source.rate_hz // wanted_hz, 1)))
    first = (source.frames - used) // 2
    slow, slow_hz = decimated(
        source.part(first, first + used),
        entry.channel,
        keep_hz=_KEPT_OVER_HIGHEST * up_to_hz,
        wanted_rate_hz=wanted_hz,
        progress=progress,
    )
    modes, no_modes = running_modes(slow, slow_hz, lines, entry, up_to_hz)
    minutes, from_s = used / source.rate_hz / 60, (source.begin + first) / source.rate_hz
    told = f"natural frequencies were looked for in {minutes:.3g} min from {from_s:.0f} s on"
    return modes, no_modes, told


def _with_hammer(
    source: RecordingSource, entry: RecordingEntry, search: TapSearch, meaning: Meaning
) -> tuple[TapSearch, HammerReading | None]:
    """All blows as the force shows them, and the response from as many as memory allows."""
    if entry.hammer is None:
        return search, None
    usable = [tap for tap in search.taps if tap.usable]
    used = set(spread(usable))
    held_back = tuple(
        tap if tap in used or not tap.usable else replace(tap, usable=False) for tap in search.taps
    )
    with ExitStack() as open_files:
        sensor = open_files.enter_context(source.reading(entry.channel))
        try:
            hammer = open_files.enter_context(source.reading(entry.hammer.channel))
        except InputError as error:
            what = f"its hammer is said to be on channel {entry.hammer.channel}: {error.what}"
            raise InputError(what, error.remedy, error.place) from error
        read = TwoChannels(sensor, hammer, source.rate_hz, source.full_scale)
        read_search, reading = read_hammer(
            replace(search, taps=held_back), read, entry.hammer, *meaning
        )
    taps = tuple(replace(tap, usable=not tap.reasons) for tap in read_search.taps)
    return replace(search, taps=taps), reading
