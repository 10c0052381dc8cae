"""Which recordings the practice rig made, and the one sentence that every face shows of them."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from pathlib import Path

from fieldkit.capture.sidecar import read_info
from fieldkit.errors import FieldkitError
from fieldkit.job.document import RecordingEntry


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


def _simulated(path: Path) -> bool:
    try:
        info = read_info(path)
    except FieldkitError:
        return False
    return info is not None and info.simulated
