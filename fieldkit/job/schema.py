"""Read a job: TOML text in, a checked Job out, every error with file, line and key."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

from fieldkit.errors import InputError, Place
from fieldkit.job.document import Job
from fieldkit.job.lines import field_loc, places
from fieldkit.job.syntax import read_file, read_table

if TYPE_CHECKING:
    from fieldkit.job.file_model import JobFile


def load_job(path: Path) -> Job:
    """Read a job file; raises InputError."""
    path = Path(path)
    text, _ = read_file(path)
    return parse_job(text, path)


def parse_job(text: str, path: Path | None = None) -> Job:
    """Read the text of a job; ``path`` is where relative recordings are found from.

    Raises InputError with file, line and key for anything that does not fit.
    """
    from fieldkit.job.convert import build_job

    table = read_table(text, path)
    _check_format(table, text, path)
    file = _fitted(table, text, path)
    try:
        return build_job(file, path)
    except InputError as error:
        where = error.place.field or ""
        raise error.at(file=path, line=places(text).line(field_loc(where))) from None


def require_excitation(job: Job) -> None:
    """Raise InputError where a job names nothing that shakes the pipe."""
    if not job.excitations:
        raise InputError(
            "the job names no excitation",
            'add [[excitation]] with speed = "1480 rpm" and orders = [1, 2], '
            'or frequency = "100 Hz"',
            Place(job.path, field="excitation"),
        )


def _check_format(table: dict[str, Any], text: str, path: Path | None) -> None:
    """The format version comes first: with another one, no other complaint means anything."""
    from fieldkit.job.file_model import FORMAT

    place = Place(path, places(text).line(("fieldkit",)), "fieldkit")
    if "fieldkit" not in table:
        what = "this does not say that it is a job file"
        raise InputError(what, f"write fieldkit = {FORMAT} on its first line", place)
    version = table["fieldkit"]
    if isinstance(version, int) and not isinstance(version, bool) and version > FORMAT:
        what = f"this job is of format {version}, and this fieldkit reads format {FORMAT}"
        raise InputError(what, "open it with a newer fieldkit", place)


def _fitted(table: dict[str, Any], text: str, path: Path | None) -> JobFile:
    from pydantic import ValidationError

    from fieldkit.job.complaints import complaint
    from fieldkit.job.file_model import JobFile

    try:
        return JobFile.model_validate(table)
    except ValidationError as error:
        raise complaint(error, places(text), path) from None
