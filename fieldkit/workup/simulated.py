"""Which recordings the practice rig made, and the one sentence that every face shows of them."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from pathlib import Path

from fieldkit.capture.sidecar import read_info
from fieldkit.errors import FieldkitError, InputError
from fieldkit.job.document import Job, RecordingEntry


def simulated_files(entries: Iterable[RecordingEntry]) -> tuple[str, ...]:
    """Names of the recordings whose sidecar says that they are simulated.

    A damaged sidecar tells nothing here; who reads its recording is told.
    """
    paths = dict.fromkeys(entry.path for entry in entries)
    return tuple(path.name for path in paths if _simulated(path))


def simulated_notice(files: Sequence[str]) -> str:
    """What is to be known of figures that rest on them; empty where there are none."""
    if not files:
        return ""
    return (
        f"SIMULATED: {', '.join(files)} came from the practice rig; nothing was measured, and no "
        "pipe may be changed on these figures"
    )


def measured_for_real(job: Job) -> bool:
    """Whether a job holds anything that was measured on a pipe."""
    return bool(job.measured) or any(not _simulated(entry.path) for entry in job.recordings)


def holds_practice(job: Job) -> bool:
    """Whether a job holds anything that the practice rig made."""
    return any(_simulated(entry.path) for entry in job.recordings)


def check_not_mixed(job: Job, *, practice: bool) -> None:
    """Raises InputError where a job would come to hold both simulated and measured data."""
    if practice and measured_for_real(job):
        raise InputError(
            "this job holds what was measured, and simulated data do not belong beside it",
            "practise on a copy of its description without recordings and measured modes",
        )
    if not practice and holds_practice(job):
        raise InputError(
            "this job holds simulated recordings, and measured data do not belong beside them",
            "record into the job of the pipe, or take the simulated recordings out",
        )


def _simulated(path: Path) -> bool:
    try:
        info = read_info(path)
    except FieldkitError:
        return False
    return info is not None and info.simulated
