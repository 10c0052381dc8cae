"""What stands beside a recording of our own: its set-up, its gaps, and where it comes from."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from fieldkit.capture.setup import FORCE
from fieldkit.capture.sidecar import Gap, RecordingInfo, read_info, sidecar_path
from fieldkit.errors import InputError, Place
from fieldkit.job.document import HammerEntry, RecordingEntry
from fieldkit.signal.recording import Recording
from fieldkit.signal.taps import Tap, TapSearch

SIMULATED = "simulated by"
"""How the note on a recording begins that was computed."""
_SHOWN = 3
_SAME_BLOW_S = 0.1


@dataclass(frozen=True)
class Beside:
    """What the sidecar adds to the samples; nothing where there is none."""

    gaps: tuple[tuple[int, int], ...] = ()
    """Frames are missing directly before a sample from the first to the second."""
    notes: tuple[str, ...] = ()
    set_aside: tuple[int, ...] = ()
    """Samples at which a blow begins that the user does not want to count."""


def beside(path: Path, recording: Recording) -> Beside:
    """The gaps of a recording and what to say of it.

    Raises InputError where the sidecar is damaged, or describes other samples.
    """
    info = read_info(path)
    if info is None:
        return Beside()
    _check_belongs(info, path, recording)
    notes = [*_origin(info), *_gap_notes(info.gaps, info.rate_hz)]
    return Beside(tuple(gap.range for gap in info.gaps), tuple(notes), info.set_aside)


def without_set_aside(search: TapSearch, set_aside: Sequence[int], rate_hz: float) -> TapSearch:
    """The search with those taps unusable that the user set aside."""
    times_s = [sample / rate_hz for sample in set_aside]
    if not times_s:
        return search

    def judged(tap: Tap) -> Tap:
        if min(abs(tap.at_s - at_s) for at_s in times_s) > _SAME_BLOW_S:
            return tap
        return replace(tap, usable=False, reasons=("set aside by the user", *tap.reasons))

    return replace(search, taps=tuple(judged(tap) for tap in search.taps))


def described(entry: RecordingEntry) -> RecordingEntry:
    """An entry that no job describes, with the set-up it was recorded with, where that is known.

    Raises InputError where its channel is the hammer's.
    """
    path = entry.path
    info = read_info(path)
    if info is None or not entry.channel <= len(info.channels):
        return entry
    setup = info.channels[entry.channel - 1]
    hammers = [n for n, channel in enumerate(info.channels, 1) if channel.quantity == FORCE]
    if entry.channel in hammers:
        raise InputError(
            f"channel {entry.channel} is the hammer's", "name a channel with a sensor", Place(path)
        )
    return replace(
        entry,
        hammer=_hammer(info, hammers[0]) if hammers and entry.kind == "tap" else None,
        quantity=setup.quantity,
        scale=setup.si_per_unit,
        direction=setup.direction,
        at_m=setup.at_m,
    )


def _hammer(info: RecordingInfo, channel: int) -> HammerEntry:
    setup = info.channels[channel - 1]
    return HammerEntry(channel, setup.si_per_unit, setup.at_m)


def _check_belongs(info: RecordingInfo, path: Path, recording: Recording) -> None:
    held = len(recording.channels), round(recording.rate_hz)
    told = len(info.channels), info.rate_hz
    if held != told:
        raise InputError(
            f"it tells of {told[0]} channel(s) at {told[1]} Hz, and {path.name} has {held[0]} at "
            f"{held[1]} Hz",
            "put back the recording it belongs to, or remove it",
            Place(sidecar_path(path)),
        )


def _origin(info: RecordingInfo) -> list[str]:
    notes = [f"{SIMULATED} {info.device}: nothing was measured"] if info.simulated else []
    if not info.ended:
        notes.append("it was cut off while it was recorded; it is read as far as it was written")
    return notes


def _gap_notes(gaps: Sequence[Gap], rate_hz: float) -> list[str]:
    if not gaps:
        return []
    told = [_gap_words(gap, rate_hz) for gap in gaps[:_SHOWN]]
    more = f" and {len(gaps) - _SHOWN} more" if len(gaps) > _SHOWN else ""
    return [f"frames are missing {', '.join(told)}{more}"]


def _gap_words(gap: Gap, rate_hz: float) -> str:
    about = "" if gap.exact else "about "
    lost = "" if gap.lost_frames is None else f", {about}{gap.lost_frames / rate_hz:.2f} s"
    return f"at {gap.frame / rate_hz:.2f} s ({gap.cause}{lost})"
