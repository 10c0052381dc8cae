"""A recording just made, added to the job it was made for."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from itertools import count
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from fieldkit.job.store import JobText


def next_recording(job: Path, kind: str) -> Path:
    """The first of ``tap-1.wav``, ``tap-2.wav``... beside a job of which there is no trace yet."""
    names = (job.parent / f"{kind}-{number}.wav" for number in count(1))
    return next(path for path in names if not any(job.parent.glob(f"{path.stem}[.-]*")))


def with_recording(
    text: JobText, file: str, kind: str, channels: Sequence[Mapping[str, str]]
) -> JobText:
    """The job with one ``[[recording]]`` for each channel, which holds the keys it is given."""
    for number, keys in enumerate(channels, start=1):
        entry: dict[str, object] = {"file": file, "kind": kind}
        if len(channels) > 1:
            entry["channel"] = number
        text = text.with_new("recording", entry | dict(keys))
    return text
