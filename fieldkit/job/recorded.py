"""A recording just made, added to the job it was made for."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
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


def _with_hammer(text: JobText, number: int, keys: Mapping[str, str]) -> JobText:
    """The last recording with the hammer's channel."""
    where = f"recording[{len(text.rows('recording')) - 1}].hammer"
    text = text.with_value(f"{where}.channel", number)
    for key in _HAMMER_KEYS:
        text = text.with_value(f"{where}.{key}", keys[key]) if key in keys else text
    return text
