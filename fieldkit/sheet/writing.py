"""Write a sheet to a file: which format, and never over a file of another kind."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

from fieldkit.errors import InputError, Place
from fieldkit.files import replace_file
from fieldkit.job.document import Job
from fieldkit.sheet.content import Document
from fieldkit.sheet.html import MARK, html
from fieldkit.sheet.markdown import markdown

FORMATS: dict[str, Callable[[Document], str]] = {
    ".html": html,
    ".htm": html,
    ".md": markdown,
    ".markdown": markdown,
}
_FIRST_BYTES = 400


def usual_path(job: Job, suffix: str = ".html") -> Path:
    """Beside the job file, named after it."""
    path = job.path or Path("job.toml")
    return path.with_name(f"{path.stem}-sheet{suffix}")


def check_target(path: Path) -> None:
    """InputError where a sheet cannot be written there: unknown suffix, another kind of file."""
    if path.suffix.lower() not in FORMATS:
        raise InputError(
            f"no sheet is written as {path.suffix or 'a file without suffix'}",
            "name a file that ends in .html or .md",
            Place(path),
        )
    if path.is_dir():
        raise InputError("this is a folder", "name a file in it", Place(path))
    if path.exists() and not is_sheet(path):
        raise InputError(
            "this file exists and is no sheet", "name another file, or remove it first", Place(path)
        )


def is_sheet(path: Path) -> bool:
    """Whether a file is a sheet that an earlier run wrote."""
    try:
        with path.open("rb") as file:
            first = file.read(_FIRST_BYTES)
    except OSError:
        return False
    return MARK.encode() in first


def write_sheet(document: Document, path: Path) -> None:
    """Render by the suffix and write in one piece; InputError where that cannot be."""
    check_target(path)
    with unwritable(path):
        replace_file(path, FORMATS[path.suffix.lower()](document).encode("utf-8", "replace"))


@contextmanager
def unwritable(path: Path) -> Iterator[None]:
    """InputError in place of an error of the system while a file is written."""
    try:
        yield
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise InputError(
            f"it cannot be written ({reason.lower()})", "name another file", Place(path)
        ) from None
