"""How a table of numbers is laid out: delimiter, decimal mark, columns, where it starts."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import islice, pairwise
from pathlib import Path

from fieldkit.errors import InputError, Place
from fieldkit.signal.text_cells import NUMBER, is_data, kind_of, split_cells, without_comment_mark

_LINES_LOOKED_AT = 1000
LONGEST_ROW = 2**16
"""Characters; a longer line is no row of a recording."""
_WRITTEN_AS = (("\t", "."), ("\t", ","), (";", "."), (";", ","), (",", "."), (None, "."))
_QUOTED_OR_SPACED_COMMA = ((",", ","), (None, ","))
_WHOLE = re.compile(r"[+-]?\d+", re.ASCII)
_DIGITS = re.compile(r"\d+", re.ASCII)


@dataclass(frozen=True)
class Layout:
    """How the rows of a table are written."""

    delimiter: str | None
    """None: any run of spaces and tabs."""
    decimal: str
    kinds: tuple[str, ...]
    """What each column holds: ``number``, ``clock`` or ``date``; empty ones at the end left out."""
    first_row: int
    """Index of the line that holds the first row."""


@dataclass(frozen=True)
class _Reading:
    """The first lines as one way of writing explains them."""

    delimiter: str | None
    decimal: str
    kinds: tuple[tuple[str, ...] | None, ...]
    """For each line: what its cells are; None where one of them is plain text."""

    @property
    def usual(self) -> tuple[int, int]:
        """How many lines have the most frequent number of columns, and that number."""
        counts = Counter(len(kinds) for kinds in self.kinds if kinds)
        return max(((lines, columns) for columns, lines in counts.items()), default=(0, 0))


def find_layout(lines: Sequence[str], path: Path) -> Layout:
    """The layout that makes sense of the most lines.

    Raises InputError where no line is a row of numbers, where a line is too long to be one, or
    where a comma could be either a delimiter or a decimal mark.
    """
    numbered = ((i, line) for i, line in enumerate(lines) if is_data(line))
    looked_at = list(islice(numbered, _LINES_LOOKED_AT))
    _check_length(looked_at, path)
    texts = [line for _, line in looked_at]
    readings = [_read(texts, *writing) for writing in _WRITTEN_AS + _QUOTED_OR_SPACED_COMMA]
    best = max(readings, key=lambda reading: reading.usual)
    count, columns = best.usual
    if count == 0:
        raise InputError(
            "no row of numbers was found",
            "give columns of numbers split by comma, semicolon, tab or spaces",
            Place(path),
        )
    first = next(i for i, kinds in enumerate(best.kinds) if kinds and len(kinds) == columns)
    if best.delimiter == ",":
        labels = _line_above(lines, looked_at[first][0])
        best = _settled(best, readings[-1], looked_at[first:], labels, path)
    kinds = best.kinds[first]
    assert kinds is not None
    return Layout(best.delimiter, best.decimal, kinds, looked_at[first][0])


def _check_length(looked_at: Sequence[tuple[int, str]], path: Path) -> None:
    for i, line in looked_at:
        if len(line) > LONGEST_ROW:
            raise InputError(
                f"a line of {len(line):,} characters is no row of numbers",
                "write one row of samples to a line",
                Place(path, i + 1),
            )


def _read(texts: Sequence[str], delimiter: str | None, decimal: str) -> _Reading:
    if delimiter is not None and not any(delimiter in text for text in texts):
        return _Reading(delimiter, decimal, (None,) * len(texts))
    return _Reading(delimiter, decimal, tuple(_kinds(text, delimiter, decimal) for text in texts))


def _kinds(text: str, delimiter: str | None, decimal: str) -> tuple[str, ...] | None:
    if delimiter == decimal and '"' not in text:
        return None
    kinds = [kind_of(cell, decimal) for cell in split_cells(text, delimiter)]
    if NUMBER not in kinds or None in kinds:
        return None
    return tuple(kind for kind in kinds if kind)


def _line_above(lines: Sequence[str], first_row: int) -> str:
    above = (line for line in reversed(lines[:first_row]) if line.strip())
    return without_comment_mark(next(above, ""))


def _settled(
    commas: _Reading,
    one_column: _Reading,
    rows: Sequence[tuple[int, str]],
    labels: str,
    path: Path,
) -> _Reading:
    """Whether ``12,345`` is two whole numbers or one with a decimal comma."""
    line, text = rows[0]
    cells = [split_cells(row, ",") for _, row in rows]
    whole = all(len(row) % 2 == 0 and _could_be_decimals(row) for row in cells)
    if not whole or _counts_up(cells) or len(split_cells(labels, ",")) == len(cells[0]):
        return commas
    padded = any(len(cell) > 1 and cell.startswith("0") for row in cells for cell in row[1::2])
    columns = {len(row) for row in cells}
    if columns == {2} and padded:
        return one_column
    if columns != {2} and not padded:
        return commas
    raise InputError(
        f"{text.strip()!r} can be read as whole numbers or as numbers with a decimal comma",
        "split the columns by semicolons, or write decimals with a point",
        Place(path, line + 1),
    )


def _could_be_decimals(row: Sequence[str]) -> bool:
    """Whether the cells, taken in pairs, could be what stands before and after a decimal comma."""
    return all(_WHOLE.fullmatch(cell) for cell in row[0::2]) and all(
        _DIGITS.fullmatch(cell) for cell in row[1::2]
    )


def _counts_up(cells: Sequence[Sequence[str]]) -> bool:
    first = [int(row[0]) for row in cells]
    return len(first) > 2 and all(b - a == 1 for a, b in pairwise(first))
