"""Cells of a line of text: how to split them, and what each one is."""

from __future__ import annotations

import csv
import re

COMMENT_MARKS = ("#", "%", "//")

NUMBER = "number"
CLOCK = "clock"
DATE = "date"

_NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eEdD][+-]?\d+)?", re.ASCII)
_NOT_FINITE = re.compile(
    r"[+-]?(?:nan|inf(?:inity)?|1\.#[a-z]+\d*)|#?n/?a|#\w+!|null", re.IGNORECASE
)
_CLOCK = re.compile(
    r"(?:(?P<date>\d{4}-\d{2}-\d{2})[T ]+)?"
    r"(?P<hour>\d{1,2}):(?P<minute>\d{2}):(?P<second>\d{2})(?:[.,](?P<fraction>\d+))?"
    r"(?:Z|[+-]\d{2}:?\d{2})?",
    re.ASCII,
)
_DATE = re.compile(r"\d{4}-\d{2}-\d{2}", re.ASCII)


def is_data(line: str) -> bool:
    """Whether a line is neither blank nor a comment."""
    stripped = line.strip()
    return bool(stripped) and not stripped.startswith(COMMENT_MARKS)


def without_comment_mark(line: str) -> str:
    """The text of a line, without the mark that makes it a comment."""
    text = line.strip(" ")
    for mark in COMMENT_MARKS:
        while text.startswith(mark):
            text = text.removeprefix(mark).strip(" ")
    return text


def split_cells(line: str, delimiter: str | None) -> list[str]:
    """The cells of a line, stripped, without empty ones at its end; None splits at any space."""
    if delimiter is None:
        return line.split()
    cells = [cell.strip() for cell in _delimited(line, delimiter)]
    while cells and not cells[-1]:
        cells.pop()
    return cells


def _delimited(line: str, delimiter: str) -> list[str]:
    if '"' in line:
        try:
            return next(csv.reader([line], delimiter=delimiter, skipinitialspace=True))
        except (csv.Error, StopIteration):
            pass
    return line.split(delimiter)


def with_point(cell: str, decimal: str) -> str:
    """A number's text with a point as its decimal mark and a plain minus sign."""
    return cell.replace(decimal, ".").replace("\N{MINUS SIGN}", "-")


def kind_of(cell: str, decimal: str) -> str | None:
    """``number`` (also NaN and the like), ``clock``, ``date``, or None for any other text."""
    text = with_point(cell, decimal)
    if _NUMBER.fullmatch(text) or is_not_finite(text):
        return NUMBER
    if _CLOCK.fullmatch(cell):
        return CLOCK
    return DATE if _DATE.fullmatch(cell) else None


def is_not_finite(text: str) -> bool:
    """Whether a cell stands for a value that is missing or not finite."""
    return bool(_NOT_FINITE.fullmatch(text))


def number_in(text: str) -> float | None:
    """The value of a number written with a point; None where it is none."""
    if not _NUMBER.fullmatch(text):
        return None
    return float(text.replace("D", "E").replace("d", "e"))


def seconds_in(cell: str) -> float | None:
    """Seconds from the start of 2000 to a clock time, a date or both; None where it is neither."""
    if _DATE.fullmatch(cell):
        return _seconds_to(cell)
    match = _CLOCK.fullmatch(cell)
    if match is None:
        return None
    midnight = _seconds_to(match["date"]) if match["date"] else 0.0
    if midnight is None:
        return None
    minutes = int(match["hour"]) * 60 + int(match["minute"])
    return midnight + minutes * 60 + float(f"{match['second']}.{match['fraction'] or 0}")


def _seconds_to(date: str) -> float | None:
    from datetime import date as calendar

    try:
        return (calendar.fromisoformat(date) - calendar(2000, 1, 1)).days * 86400.0
    except ValueError:
        return None


def fraction_digits(cell: str) -> int:
    """Digits a clock time shows after the second."""
    match = _CLOCK.fullmatch(cell)
    return len(match["fraction"] or "") if match else 0
