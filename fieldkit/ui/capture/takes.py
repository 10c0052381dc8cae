"""What a measurement leaves on the disk, and how it comes into the job."""

from __future__ import annotations

from collections.abc import Iterable
from contextlib import suppress
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

from fieldkit.capture.sidecar import sidecar_path
from fieldkit.job.recorded import with_note, with_recording

if TYPE_CHECKING:
    from fieldkit.capture.setup import ChannelSetup
    from fieldkit.job.store import JobText

PRACTICE_TITLE = "practice"


@dataclass(frozen=True)
class Take:
    """One recording of a measurement."""

    path: Path
    channels: tuple[ChannelSetup, ...]
    kind: str
    first_frame: int = 0
    """Frames of the session before it."""
    usable: int = 0
    """Blows in it that count; of a running recording 1."""
    note: str = ""
    """What was noted beside it, for the job file."""


@dataclass(frozen=True)
class Result:
    """How a measurement ended."""

    takes: tuple[Take, ...] = ()
    add: bool = False
    """Whether the user wants them in the job."""
    again: bool = False
    """Whether to go back to the set-up."""
    trouble: str = ""
    """What ended it early, one sentence."""
    quits: bool = False
    """Whether the app is to end too."""

    @property
    def useful(self) -> tuple[Take, ...]:
        """Those that a job can be worked out from."""
        return tuple(take for take in self.takes if take.usable)


def with_takes(text: JobText, takes: Iterable[Take]) -> JobText:
    """The job with these recordings; raises InputError."""
    for take in takes:
        keys = [setup.as_table() for setup in take.channels]
        text = with_recording(text, take.path.name, take.kind, keys)
        text = with_note(text, f"{take.path.name}: {take.note}") if take.note else text
    return text


def remove_empty(path: Path) -> None:
    """Take away a recording in which nothing happened."""
    for file in (path, sidecar_path(path)):
        with suppress(OSError):
            file.unlink()


def practice_copy(text: JobText, path: Path) -> JobText:
    """The description alone, in a file of its own: simulated and measured data never mix."""
    from fieldkit.ui.forms import without_taps

    bare = without_taps(text)
    for index in reversed(range(len(bare.rows("recording")))):
        bare = bare.without("recording", index)
    title = bare.get("title") or "Job"
    return replace(bare.with_value("title", f"{title} ({PRACTICE_TITLE})"), path=path)


def free_path(folder: Path, stem: str) -> Path:
    """The first of ``stem.toml``, ``stem-2.toml``... that is not there."""
    path, number = folder / f"{stem}.toml", 1
    while path.exists():
        number += 1
        path = folder / f"{stem}-{number}.toml"
    return path
