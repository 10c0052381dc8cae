"""From a file on the disk to a plain TOML table, with a sentence where that fails."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path
from typing import Any

from fieldkit.errors import InputError, Place

LARGEST_FILE = 1_000_000
"""Bytes; a job file has a few thousand."""
LONGEST_LINE = 10_000
"""Characters; a hundred pairs of stations need a quarter of it."""
_BOM = b"\xef\xbb\xbf"
_WHERE = re.compile(r"\s*\(at (?:line (\d+), column \d+|end of document)\)")
_GIVEN_TWICE = re.compile(r"overwrite|twice|mutate|redefine|duplicate", re.IGNORECASE)
_SHOWN = 60


def read_file(path: Path) -> tuple[str, bool]:
    """(text, whether it began with a byte order mark); line ends are left as they are."""
    raw = _bytes_of(path)
    marked = raw.startswith(_BOM)
    try:
        return raw.removeprefix(_BOM).decode("utf-8"), marked
    except UnicodeDecodeError as error:
        line = raw.count(b"\n", 0, error.start) + 1
        raise InputError(
            "this is not UTF-8 text", "save it from the editor as UTF-8", Place(path, line)
        ) from None


def _bytes_of(path: Path) -> bytes:
    try:
        if path.is_dir():
            what = "this is a folder, not a job file"
            raise InputError(what, "name the job file in it, such as job.toml", Place(path))
        if path.exists() and not path.is_file():
            what = "this is not a regular file"
            raise InputError(what, "name a job file on disk", Place(path))
        if path.stat().st_size > LARGEST_FILE:
            what = "this is far too large to be a job file"
            raise InputError(what, "name the .toml file that describes the span", Place(path))
        return path.read_bytes()
    except FileNotFoundError:
        what, remedy = "there is no such file", "check the name and the folder"
    except (OSError, ValueError) as error:
        what, remedy = f"it cannot be read ({_reason(error)})", "check that you may read it"
    raise InputError(what, remedy, Place(path))


def _reason(error: Exception) -> str:
    return (getattr(error, "strerror", None) or str(error)).lower()


def read_table(text: str, path: Path | None = None) -> dict[str, Any]:
    """The plain TOML table of a text; raises InputError with file, line and key."""
    _check_lines(text, path)
    try:
        return tomllib.loads(text)
    except RecursionError:
        raise InputError(
            "its values are nested too deeply",
            "a job needs no more than three levels",
            Place(path, 1),
        ) from None
    except tomllib.TOMLDecodeError as error:
        raise _syntax_error(str(error), text, path) from None
    except ValueError:
        raise InputError(
            "it holds a number that is far too long", "write it as 1e6", Place(path, 1)
        ) from None


def _check_lines(text: str, path: Path | None) -> None:
    """A key of thousands of parts would take gigabytes to read."""
    for number, line in enumerate(text.split("\n"), start=1):
        if len(line) > LONGEST_LINE:
            raise InputError(
                f"a line of {len(line):,} characters is far too long for a job file",
                "break it, or name the .toml file that describes the span",
                Place(path, number),
            )


def _syntax_error(message: str, text: str, path: Path | None) -> InputError:
    where = _WHERE.search(message)
    line = int(where[1]) if where and where[1] else len(text.rstrip().split("\n"))
    reason = _WHERE.sub("", message)
    place = Place(path, line, _key_near(text, line))
    shown = _line(text, line)
    if _GIVEN_TWICE.search(reason):
        return InputError(f"{shown!r} is given a second time", "keep one of the two", place)
    if reason == r"Illegal character '\n'":
        reason = "its closing quote is missing"
    return InputError(
        f"{shown!r} is not valid TOML ({reason[:1].lower()}{reason[1:]})",
        'put text and quantities in quotes, such as length = "4.2 m"',
        place,
    )


def _line(text: str, line: int) -> str:
    found = text.split("\n")[line - 1 : line]
    shown = found[0].strip() if found else ""
    return shown if len(shown) <= _SHOWN else shown[:_SHOWN] + "..."


def _key_near(text: str, line: int) -> str | None:
    """The key on a line, behind the table it stands in, as far as broken text shows it."""
    before = text.split("\n")[:line]
    found = [re.match(r"\s*(\[{1,2})\s*([\w.-]{1,60})\s*\]", one) for one in before]
    headers = [(header[2], header[1] == "[[") for header in found if header]
    table, repeated = headers[-1] if headers else ("", False)
    index = f"[{headers.count((table, True)) - 1}]" if repeated else ""
    key = re.match(r"\s*([\w.-]{1,60})\s*=", before[-1])
    return ".".join(part for part in (table + index, key[1] if key else "") if part) or None
