"""Numbers out of the rows of a table, and the line of the first one that is bad."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import InputError
from fieldkit.signal.text_cells import (
    COMMENT_MARKS,
    NUMBER,
    is_data,
    is_not_finite,
    number_in,
    seconds_in,
    split_cells,
    with_point,
)
from fieldkit.signal.text_layout import Layout

LARGEST_VALUE = 1e30
"""Beyond it a value is no measurement, and its square may overflow."""
_ROWS_AT_ONCE = 20_000
_LONGEST_QUOTE = 30


@dataclass(frozen=True)
class Table:
    """The rows of a text file as numbers."""

    values: NDArray[np.float64]
    """(rows, columns), column after column in memory; clock times and dates in seconds."""
    lines: range | NDArray[np.int32]
    """(rows,) line of each row in the file, counted from 1."""


def read_table(lines: Sequence[str], layout: Layout, path: Path) -> Table:
    """All rows from the first one to the end of the file.

    Raises InputError with the line of the first row that has a different number of columns,
    text in place of a number, or a value that is missing or not finite.
    """
    values = np.empty((len(layout.kinds), len(lines) - layout.first_row))
    numbers: list[NDArray[np.int32]] = []
    count = 0
    for start in range(layout.first_row, len(lines), _ROWS_AT_ONCE):
        texts, at = _rows(list(lines[start : start + _ROWS_AT_ONCE]), start)
        if not texts:
            continue
        block = _read_fast(texts, layout)
        if block is None:
            block = _read_carefully(texts, at, layout, path)
        values[:, count : count + len(at)] = block.T
        numbers.append(at + np.int32(1))
        count += len(at)
    return Table(values[:, :count].T, _numbered(numbers, count))


def _rows(texts: list[str], start: int) -> tuple[list[str], NDArray[np.int32]]:
    """Those of the lines from ``start`` on that hold data, and where they stand."""
    at = np.arange(start, start + len(texts), dtype=np.int32)
    joined = "\n".join(texts)
    plain = not any(mark in joined for mark in COMMENT_MARKS)
    if plain and all(map(str.strip, texts)):
        return texts, at
    kept = [i for i, text in enumerate(texts) if is_data(text)]
    return [texts[i] for i in kept], at[kept]


def _numbered(numbers: Sequence[NDArray[np.int32]], count: int) -> range | NDArray[np.int32]:
    """Lines of all rows; a range where no other line stands between them."""
    first, last = int(numbers[0][0]), int(numbers[-1][-1])
    return range(first, last + 1) if last - first == count - 1 else np.concatenate(numbers)


def _read_fast(texts: list[str], layout: Layout) -> NDArray[np.float64] | None:
    """The rows by numpy's own reader; None where anything at all is out of the ordinary."""
    if layout.delimiter == layout.decimal or any(kind != NUMBER for kind in layout.kinds):
        return None
    joined = "\n".join(texts)
    if not joined.isascii() or '"' in joined or "_" in joined:
        return None
    spare = " \t\r" if layout.delimiter is None else layout.delimiter + " \t\r"
    rows = [row.rstrip(spare) for row in joined.replace(layout.decimal, ".").split("\n")]
    if "" in rows:
        return None
    try:
        block = np.loadtxt(rows, delimiter=layout.delimiter, comments=None, ndmin=2)
    except ValueError:
        return None
    if block.shape != (len(texts), len(layout.kinds)):
        return None
    return block if np.all(np.abs(block) <= LARGEST_VALUE) else None


def _read_carefully(
    texts: list[str], at: NDArray[np.int32], layout: Layout, path: Path
) -> NDArray[np.float64]:
    block = np.empty((len(texts), len(layout.kinds)))
    for row, (text, i) in enumerate(zip(texts, at, strict=True)):
        try:
            block[row] = _row_values(text, layout)
        except InputError as error:
            raise error.at(file=path, line=int(i) + 1) from None
    return block


def _row_values(text: str, layout: Layout) -> list[float]:
    cells = split_cells(text, layout.delimiter)
    if len(cells) != len(layout.kinds):
        raise InputError(
            f"the row has {len(cells)} column(s) where {len(layout.kinds)} are expected",
            "give every row the same columns; look for a row that was cut off",
        )
    return [
        _value(cell, kind, column, layout.decimal)
        for column, (cell, kind) in enumerate(zip(cells, layout.kinds, strict=True), start=1)
    ]


def _value(cell: str, kind: str, column: int, decimal: str) -> float:
    if kind != NUMBER:
        seconds = seconds_in(cell)
        if seconds is None:
            raise InputError(
                f"{quoted(cell)} in column {column} is not a time",
                "write times as hh:mm:ss.fff or 2024-01-31T12:30:00.000",
            )
        return seconds
    text = with_point(cell, decimal)
    value = number_in(text)
    if value is not None and abs(value) <= LARGEST_VALUE:
        return value
    if not cell:
        raise InputError(f"column {column} is empty", "fill in the value or remove the row")
    if value is not None:
        raise InputError(
            f"{quoted(cell)} in column {column} is too large to be measured",
            "remove the rows where the logger overflowed, or record again",
        )
    if is_not_finite(text):
        raise InputError(
            f"{quoted(cell)} in column {column} is no finite number",
            "remove the rows without a value, or record again",
        )
    raise InputError(
        f"{quoted(cell)} in column {column} is not a number",
        "remove text from among the rows, or start the line with #",
    )


def quoted(text: str) -> str:
    """Text out of a file, safe to print: control characters escaped, cut to a readable length."""
    return repr(text if len(text) <= _LONGEST_QUOTE else text[:_LONGEST_QUOTE] + "...")
