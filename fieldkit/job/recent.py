"""The jobs a user opened last, and how far each one had come.

The list is a convenience: where it cannot be read it is empty, where it cannot be written nothing
is said.
"""

from __future__ import annotations

import json
import os
import threading
import time
from contextlib import suppress
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

from fieldkit.errors import InputError
from fieldkit.files import replace_file
from fieldkit.job.folders import state_folder

MOST = 20
NO_RECORDINGS = "no recordings yet"
GONE = "no longer there"
_ONE_AT_A_TIME = threading.Lock()


@dataclass(frozen=True)
class Recent:
    """A job that was opened before."""

    path: str
    opened_s: float
    """When, in seconds since 1970."""
    state: str = ""
    """What working it out came to; empty where that was never known."""
    stamp: str = ""
    """Size and time of the file that ``state`` speaks of."""


def recents(folder: Path | None = None) -> tuple[Recent, ...]:
    """The jobs opened last, the newest first."""
    try:
        entries = json.loads(_list_path(folder).read_text("utf-8"))
        return tuple(_entry(entry) for entry in entries)[:MOST]
    except (OSError, ValueError, TypeError, KeyError):
        return ()


def remember(path: Path, state: str = "", folder: Path | None = None) -> None:
    """Put a job at the head of the list; an empty ``state`` keeps the one known before."""
    with _ONE_AT_A_TIME:
        _remember(os.path.realpath(path), state, folder)


def _remember(full: str, state: str, folder: Path | None) -> None:
    listed = recents(folder)
    before = next((entry for entry in listed if entry.path == full), None)
    stamp = _stamp(Path(full)) if state else ""
    if not state and before is not None:
        state, stamp = before.state, before.stamp
    others = [entry for entry in listed if entry.path != full]
    newest = Recent(full, time.time(), state, stamp)
    _write([newest, *others][:MOST], folder)


def forget(path: Path, folder: Path | None = None) -> None:
    """Take a job from the list."""
    full = os.path.realpath(path)
    _write([entry for entry in recents(folder) if entry.path != full], folder)


def state_of(path: Path, known: Recent | None = None) -> str:
    """How far a job has come, in a few words.

    What was known of the very same file is told again; else the file is read.
    """
    if not path.exists():
        return GONE
    if known is not None and known.state and known.stamp == _stamp(path):
        return known.state
    from fieldkit.job.schema import load_job

    try:
        job = load_job(path)
    except InputError as error:
        return f"cannot be read: {error.what}"
    count = len(job.recordings) + len(job.measured)
    if not count:
        return NO_RECORDINGS
    measured = "1 measurement" if count == 1 else f"{count} measurements"
    return f"{measured}, {'changed since' if known and known.state else 'not worked out yet'}"


def title_of(path: Path) -> str:
    """The title a job file gives itself, or its name; reads as little as it can."""
    from fieldkit.job.syntax import read_file, read_table

    try:
        title = read_table(read_file(path)[0], path).get("title")
    except InputError:
        title = None
    return title if isinstance(title, str) and title.strip() else path.stem


def is_job(path: Path) -> bool:
    """Whether a file looks like a job: its first lines give the format."""
    try:
        with path.open("rb") as file:
            head = file.read(4096)
    except OSError:
        return False
    return any(
        line.lstrip(b"\xef\xbb\xbf \t").startswith(b"fieldkit") for line in head.split(b"\n")
    )


def _entry(table: dict[str, Any]) -> Recent:
    return Recent(
        str(table["path"]), float(table["opened_s"]), str(table["state"]), str(table["stamp"])
    )


def _stamp(path: Path) -> str:
    with suppress(OSError):
        status = path.stat()
        return f"{status.st_size} {status.st_mtime_ns}"
    return ""


def _list_path(folder: Path | None) -> Path:
    return (folder or state_folder()) / "recent.json"


def _write(entries: list[Recent], folder: Path | None) -> None:
    path = _list_path(folder)
    with suppress(OSError):
        path.parent.mkdir(mode=0o700, parents=True, exist_ok=True)
        content = json.dumps([asdict(entry) for entry in entries], indent=1)
        replace_file(path, content.encode("utf-8", "surrogateescape"))
