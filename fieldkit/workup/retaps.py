"""Recordings made after a change: with what they were set up, and in which state."""

from __future__ import annotations

import filecmp
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from fieldkit.capture.setup import FORCE
from fieldkit.capture.sidecar import read_info
from fieldkit.errors import InputError, Place
from fieldkit.job.document import Job, RecordingEntry
from fieldkit.span.layout import State
from fieldkit.workup.beside import described

DIRECTIONS = ("vertical", "lateral", "axial")


@dataclass(frozen=True)
class Retaps:
    """The recordings with their set-up, and what was taken for granted about it."""

    entries: tuple[RecordingEntry, ...]
    notes: tuple[str, ...]


def retaps(job: Job, files: Sequence[Path], kind: str = "tap", like: Sequence[int] = ()) -> Retaps:
    """Each file with the set-up that stands beside it, or that of a recording of the job.

    ``like`` names, counted from 1, the recording of the job that each file is set up as. Raises
    InputError where that is not told by name, number or order.
    """
    known = _by_file(job.recordings_of(kind))
    _check_like(files, like, known)
    entries: list[RecordingEntry] = []
    notes: list[str] = []
    taken: list[str] = []
    for i, path in enumerate(files):
        _check_there(path)
        own = _described(path, kind)
        if not own:
            model = known[like[i] - 1] if like else _alike(path, i, files, known, kind)
            own = [replace(entry, path=path) for entry in model]
            old = model[0].path.name
            taken.append(old if old == path.name else f"{path.name} as {old}")
        entries += own
        notes += _told_before(path, job)
    if taken:
        notes.append(
            "sensor, place and direction are taken to be those of the recordings before the "
            f"change: {', '.join(taken)}"
        )
    return Retaps(tuple(entries), tuple(notes))


def state_of_retap(job: Job, fill: float | None = None, state: str = "tapped") -> State:
    """As tapped, or as running, with another fill where one is given; raises InputError."""
    found = job.running if state == "running" else job.tapped
    if fill is None:
        return found
    if not 0.0 <= fill <= 1.0:
        raise InputError(f"a fill of {fill:g}", "give the filled share of the bore, from 0 to 1")
    return replace(found, fill=(fill, fill))


def _by_file(entries: Sequence[RecordingEntry]) -> list[list[RecordingEntry]]:
    files: dict[Path, list[RecordingEntry]] = {}
    for entry in entries:
        files.setdefault(entry.path, []).append(entry)
    return list(files.values())


def _check_like(
    files: Sequence[Path], like: Sequence[int], known: Sequence[Sequence[RecordingEntry]]
) -> None:
    if like and len(like) != len(files):
        raise InputError(
            f"--like is given {len(like)} times for {len(files)} recordings",
            "give it once for each recording, in their order",
        )
    wrong = [number for number in like if not 1 <= number <= len(known)]
    if wrong:
        names = ", ".join(f"{i} {group[0].path.name}" for i, group in enumerate(known, 1))
        raise InputError(
            f"the job has no recording {wrong[0]}", f"use one of {names}" if names else "leave it"
        )


def _check_there(path: Path) -> None:
    if not path.is_file():
        what = "this is a folder" if path.is_dir() else "there is no such file"
        raise InputError(what, "name the recordings made after the change", Place(path))


def _described(path: Path, kind: str) -> list[RecordingEntry]:
    """Every sensor that the sidecar tells of; none without one."""
    info = read_info(path)
    if info is None:
        return []
    sensors = [n for n, channel in enumerate(info.channels, 1) if channel.quantity != FORCE]
    state = "tapped" if kind == "tap" else "running"
    return [described(RecordingEntry(path, kind, state, n)) for n in sensors]


def _alike(
    path: Path,
    number: int,
    files: Sequence[Path],
    known: Sequence[Sequence[RecordingEntry]],
    kind: str,
) -> Sequence[RecordingEntry]:
    """The job's recording of the same name, of the direction in the name, or in the same place."""
    same = [group for group in known if group[0].path.stem == path.stem]
    spoken = [d for d in DIRECTIONS if d in path.stem.lower()]
    if not same and len(spoken) == 1:
        same = [g for g in known if {entry.direction for entry in g} == {spoken[0]}]
    if len(same) == 1:
        return same[0]
    if len(known) == 1 or (len(known) == len(files) and not spoken):
        return known[number if len(known) > 1 else 0]
    listed = ", ".join(f"{i} {group[0].path.name}" for i, group in enumerate(known, 1))
    raise InputError(
        f"it is not told how {path.name} was set up",
        f"give --like with the number of the recording it is set up as: {listed}"
        if known
        else f"the job has no {kind} recording; fieldkit record keeps the set-up beside a file",
        Place(path),
    )


def _told_before(path: Path, job: Job) -> list[str]:
    """A warning where the file is one of the job's own."""
    for entry in job.recordings:
        if entry.path.is_file() and filecmp.cmp(path, entry.path, shallow=False):
            return [
                f"{path.name} is the same recording as {entry.path.name} of the job, which was "
                "made before the change"
            ]
    return []
