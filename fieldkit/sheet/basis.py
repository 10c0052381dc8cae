"""What a sheet was made from: the files with their hashes, their dates, and the job's own words."""

from __future__ import annotations

import hashlib
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path
from typing import Any

from fieldkit.capture.sidecar import sidecar_path
from fieldkit.job.document import Job

NO_FILE = "not saved to a file"


@dataclass(frozen=True)
class Input:
    """One file that went in."""

    name: str
    sha256: str
    """Empty where it could not be read."""
    size: int = 0


@dataclass(frozen=True)
class Basis:
    """Everything the results of a sheet were computed from."""

    job: Input
    job_date: str
    """When the job file was last changed; what stands in its place where there is none."""
    recordings: Mapping[Path, Input]
    sidecars: tuple[Input, ...]
    typed: tuple[Mapping[str, Any], ...]
    """The ``recording`` tables as the job file has them; empty where it was not read."""
    written: str
    """Date of the sheet."""

    @property
    def inputs(self) -> tuple[Input, ...]:
        """Every file, the job first."""
        return (self.job, *self.recordings.values(), *self.sidecars)


def basis_of(job: Job, text: str | None = None, now: datetime | None = None) -> Basis:
    """Hash every input of a job.

    ``text`` is the job as it was worked out where the file may differ: in an app with edits that
    were not saved.
    """
    paths = list(dict.fromkeys(entry.path for entry in job.recordings))
    beside = [sidecar_path(path) for path in paths]
    own, date, content = _job_input(job.path, text)
    return Basis(
        own,
        date,
        {path: hashed(path) for path in paths},
        tuple(hashed(path) for path in beside if path.is_file()),
        _typed(content),
        (now or datetime.now()).strftime("%Y-%m-%d %H:%M"),
    )


def hashed(path: Path) -> Input:
    """A file with its hash."""
    try:
        with path.open("rb") as file:
            digest = hashlib.file_digest(file, "sha256").hexdigest()
        return Input(path.name, digest, path.stat().st_size)
    except OSError:
        return Input(path.name, "")


def _job_input(path: Path | None, text: str | None) -> tuple[Input, str, str]:
    """Name and hash, date, and text of a job."""
    stored, date = b"", NO_FILE
    if path is not None:
        try:
            stored = path.read_bytes()
            date = datetime.fromtimestamp(path.stat().st_mtime).strftime("%Y-%m-%d %H:%M")
        except OSError:
            date = "its file cannot be read"
    name = path.name if path is not None else "job"
    saved = stored.decode("utf-8-sig", "replace")
    if text is not None and text != saved:
        content, date = text.encode("utf-8"), f"{date}, with changes that were not saved"
    else:
        content, text = stored, saved
    return Input(name, hashlib.sha256(content).hexdigest(), len(content)), date, text


def _typed(text: str) -> tuple[Mapping[str, Any], ...]:
    try:
        return tuple(tomllib.loads(text).get("recording", ()))
    except tomllib.TOMLDecodeError:
        return ()
