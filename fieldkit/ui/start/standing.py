"""How far a job has come, in a few words, and what a file is, for the lists of files."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from fieldkit.errors import FieldkitError
from fieldkit.sheet.plain import percent
from fieldkit.ui.words import count, seconds

if TYPE_CHECKING:
    from fieldkit.workup import Workup

RECORDING_SUFFIXES = (".wav", ".flac", ".aif", ".aiff", ".aifc", ".csv", ".txt", ".tsv")


def standing(found: Workup) -> str:
    """``3 taps, matched, best fix 94 %``."""
    parts = [_measured(found)]
    if found.match is not None:
        parts.append("matched")
    detuning = found.detuning
    if detuning is not None and detuning.chance_now >= found.job.goal.chance:
        parts.append(f"clear as it is, {percent(detuning.chance_now)}")
    elif detuning is not None and detuning.fixes:
        parts.append(f"best fix {percent(detuning.fixes[0].chance)}")
    elif detuning is not None:
        parts.append("no fix found")
    return ", ".join(parts)


def _measured(found: Workup) -> str:
    taps = sum(tap.usable for reading in found.taps for tap in reading.search.taps)
    if taps:
        return count(taps, "tap")
    if found.job.measured:
        return count(len(found.job.measured), "typed peak")
    return "running only" if found.running else "no recordings yet"


def about_recording(path: Path) -> str:
    """``21.3 s, 2 channels``, or why it cannot be read."""
    from fieldkit.signal.source import open_recording

    try:
        source = open_recording(path)
    except FieldkitError as error:
        return str(getattr(error, "what", error))
    except Exception as error:
        return f"cannot be read ({type(error).__name__})"
    return f"{seconds(source.duration_s)}, {count(len(source.channels), 'channel')}"


def about_job(path: Path) -> str:
    """What a job file in a folder is, and how far it has come."""
    from fieldkit.job.recent import is_job, state_of, title_of

    try:
        if not is_job(path):
            return "no job file"
        return f"{title_of(path)}: {state_of(path)}"
    except Exception as error:
        return f"cannot be read ({type(error).__name__})"
