"""Unsaved work, kept as it is typed, so that a crash or a dropped line loses nothing.

The job file is the user's and is written only when the user says so. What is not in it yet lies
here, one file for each job, until it is saved or thrown away.
"""

from __future__ import annotations

import hashlib
import json
import os
import secrets
from collections.abc import Mapping
from contextlib import suppress
from dataclasses import asdict, dataclass, field
from pathlib import Path
from typing import Any

from fieldkit.job.folders import state_folder


@dataclass(frozen=True)
class Kept:
    """Work that is in no job file yet."""

    key: str
    """Tells the jobs apart."""
    path: str = ""
    """The job file it belongs to; empty for a job that was never saved."""
    title: str = ""
    text: str = ""
    """The text of the job with every change."""
    base: str = ""
    """Digest of the file's text that the changes began from."""
    typing: Mapping[str, Any] = field(default_factory=dict)
    """A form that was open: its table, its row, and what was typed into it."""
    draft: Mapping[str, Any] = field(default_factory=dict)
    """The answers of a new job that is still being described."""
    process: int = 0
    """Number of the process that keeps it."""
    kept_s: float = 0.0
    """When it was written, in seconds since 1970; filled in on reading."""

    @property
    def stands_alone(self) -> bool:
        """Whether no file holds any of it."""
        return not self.path


def key_of(path: Path | None) -> str:
    """The key of a job file, or a fresh one for a job without a file."""
    if path is None:
        return f"new-{secrets.token_hex(8)}"
    return hashlib.sha256(os.path.realpath(path).encode("utf-8", "surrogateescape")).hexdigest()[
        :24
    ]


def digest(text: str) -> str:
    """What tells one text from another."""
    return hashlib.sha256(text.encode("utf-8", "surrogatepass")).hexdigest()[:24]


def keep(kept: Kept, folder: Path | None = None) -> None:
    """Write it in one piece, in place of what was kept under its key; raises OSError.

    It does not wait for the disk: a process that is killed loses nothing by that, and no key
    press waits. ``settle`` does.
    """
    path = _path(kept.key, folder)
    path.parent.mkdir(mode=0o700, parents=True, exist_ok=True)
    beside = path.with_name(f".{path.name}.{os.getpid()}")
    content = json.dumps(asdict(kept) | {"process": os.getpid()})
    try:
        beside.write_bytes(content.encode("utf-8", "surrogatepass"))
        beside.replace(path)
    finally:
        with suppress(OSError):
            beside.unlink(missing_ok=True)


def settle(key: str, folder: Path | None = None) -> None:
    """Wait until what is kept is on the disk, so that a lost battery does not lose it."""
    with suppress(OSError), _path(key, folder).open("rb+") as file:
        os.fsync(file.fileno())


def drop(key: str, folder: Path | None = None) -> None:
    """Keep it no longer: it was saved, or the user threw it away."""
    with suppress(OSError):
        _path(key, folder).unlink(missing_ok=True)


def kept_under(key: str, folder: Path | None = None) -> Kept | None:
    """What is kept under a key; None where there is nothing, or nothing that can be read."""
    return _read(_path(key, folder))


def kept_for(path: Path, file_text: str, folder: Path | None = None) -> Kept | None:
    """What is kept for a job file and differs from the text in it."""
    kept = kept_under(key_of(path), folder)
    if kept is None or (kept.text == file_text and not kept.typing):
        return None
    return kept


def all_kept(folder: Path | None = None) -> tuple[Kept, ...]:
    """Everything that waits to be taken up again, the newest first."""
    home = (folder or state_folder()) / "unsaved"
    try:
        found = [_read(path) for path in home.glob("*.json")]
    except OSError:
        return ()
    return tuple(sorted((k for k in found if k is not None), key=lambda k: -k.kept_s))


def keeper_lives(kept: Kept) -> bool:
    """Whether the process that keeps it may still run (told on POSIX systems only)."""
    if os.name != "posix" or kept.process in (0, os.getpid()):
        return False
    try:
        os.kill(kept.process, 0)
    except PermissionError:
        return True
    except (OSError, OverflowError):
        return False
    return True


def _path(key: str, folder: Path | None) -> Path:
    return (folder or state_folder()) / "unsaved" / f"{key}.json"


def _read(path: Path) -> Kept | None:
    try:
        table = json.loads(path.read_bytes().decode("utf-8", "surrogatepass"))
        when = path.stat().st_mtime
        known = {name: table[name] for name in Kept.__dataclass_fields__ if name in table}
        return Kept(**(known | {"kept_s": when}))
    except (OSError, ValueError, TypeError, KeyError):
        return None
