"""Frequency responses into files, one for each recording with a hammer."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from pathlib import Path

from fieldkit.errors import InputError, Place
from fieldkit.files import replace_file
from fieldkit.sheet.responses import columns_text
from fieldkit.workup import ResponseReading


def write_responses(
    target: Path,
    found: Sequence[ResponseReading | None],
    up_to_hz: float,
    inputs: Iterable[Path],
) -> dict[int, Path]:
    """The file of each response by the number of its recording, from 0.

    A single response goes into ``target``; several into files beside it with the number of their
    recording, from 1, behind the name. Raises InputError where there is none to write, where a
    file would replace one of ``inputs``, or cannot be written.
    """
    wanted = {i: response for i, response in enumerate(found) if response is not None}
    if not wanted:
        raise InputError(
            "none of these recordings has a hammer channel, so there is no response to write",
            "name it in the job, such as hammer = { channel = 2 } below [[recording]]",
            Place(target),
        )
    texts = {i: columns_text(response, up_to_hz) for i, response in wanted.items()}
    files = {i: target if len(wanted) == 1 else numbered(target, i + 1) for i in wanted}
    known = {path.resolve() for path in inputs}
    for path in files.values():
        if path.resolve() in known:
            raise InputError(
                "this file is read here, and would be lost", "name another", Place(path)
            )
    for i, path in files.items():
        _write(path, texts[i])
    return files


def numbered(target: Path, number: int) -> Path:
    """``response-2.csv`` for the second recording."""
    return target.with_name(f"{target.stem}-{number}{target.suffix}")


def _write(path: Path, text: str) -> None:
    try:
        replace_file(path, text.encode("utf-8"))
    except (OSError, ValueError) as error:
        reason = (getattr(error, "strerror", None) or str(error)).lower()
        what = f"it cannot be written ({reason})"
        raise InputError(what, "name another file or folder", Place(path)) from None
