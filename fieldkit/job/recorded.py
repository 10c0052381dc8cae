"""A recording just made, added to the job it was made for."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from itertools import count
from pathlib import Path
from typing import TYPE_CHECKING

from fieldkit.errors import InputError

if TYPE_CHECKING:
    from fieldkit.job.store import JobText

_HAMMER_KEYS = ("sensitivity", "full_scale", "scale", "at")


def next_recording(job: Path, kind: str) -> Path:
    """The first of ``tap-1.wav``, ``tap-2.wav``... beside a job of which there is no trace yet."""
    names = (job.parent / f"{kind}-{number}.wav" for number in count(1))
    return next(path for path in names if not any(job.parent.glob(f"{path.stem}[.-]*")))


def with_recording(
    text: JobText, file: str, kind: str, channels: Sequence[Mapping[str, str]]
) -> JobText:
    """The job with one ``[[recording]]`` for each sensor, which holds the keys it is given.

    The channel of a hammer, whose quantity is force, becomes a part of the tap recordings. Raises
    InputError where there are two hammers, or nothing else.
    """
    sensors = [(n, keys) for n, keys in enumerate(channels, 1) if keys["quantity"] != "force"]
    hammers = [(n, keys) for n, keys in enumerate(channels, 1) if keys["quantity"] == "force"]
    if len(hammers) > 1 or not sensors:
        what = "there is more than one hammer" if sensors else "no channel has a sensor"
        raise InputError(what, "connect one hammer at most, and a sensor beside it")
    for number, keys in sensors:
        entry: dict[str, object] = {"file": file, "kind": kind}
        if len(channels) > 1:
            entry["channel"] = number
        text = text.with_new("recording", entry | dict(keys))
        if hammers and kind == "tap":
            text = _with_hammer(text, *hammers[0])
    return text


def with_calibration(
    text: JobText, channel: int, keys: Mapping[str, str], comment: str
) -> tuple[JobText, tuple[str, ...]]:
    """The job with a comment about a calibration above its recordings, and the keys in those of
    that channel that have none yet; also the files of these."""
    files = []
    for index, row in enumerate(text.rows("recording")):
        bare = not {"sensitivity", "scale"} & row.keys()
        if bare and int(row.get("channel") or 1) == channel:
            files.append(row["file"])
            for key, value in keys.items():
                text = text.with_value(f"recording[{index}].{key}", value)
    return with_note(text, f"channel {channel} {comment}"), tuple(files)


def with_note(text: JobText, comment: str) -> JobText:
    """The job with a comment on lines of its own before the first recording, or at the end."""
    newline = "\r\n" if "\r\n" in text.text else "\n"
    lines = text.text.splitlines(keepends=True)
    heads = [i for i, line in enumerate(lines) if line.strip().startswith("[[recording]]")]
    if lines and not lines[-1].endswith(("\n", "\r")):
        lines[-1] += newline
    at = heads[0] if heads else len(lines)
    added = replace(text, text="".join([*lines[:at], f"# {comment}{newline}", *lines[at:]]))
    return added if added.table == text.table else text


def _with_hammer(text: JobText, number: int, keys: Mapping[str, str]) -> JobText:
    """The last recording with the hammer's channel."""
    where = f"recording[{len(text.rows('recording')) - 1}].hammer"
    text = text.with_value(f"{where}.channel", number)
    for key in _HAMMER_KEYS:
        text = text.with_value(f"{where}.{key}", keys[key]) if key in keys else text
    return text
