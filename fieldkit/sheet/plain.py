"""Plain text for terminals and files: columns that line up, nothing that steers a terminal."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Sequence
from typing import NamedTuple

WIDTH = 78


class Cells(NamedTuple):
    """A table before anybody lays it out: text, HTML and Markdown share it."""

    head: Sequence[str]
    rows: Sequence[Sequence[str]]


def clean(text: str) -> str:
    """Text from a file with control and formatting characters made visible as ``\\u..``."""
    return "".join(
        character if character.isprintable() else f"\\u{ord(character):04x}" for character in text
    )


def percent(chance: float) -> str:
    """A chance as people say it; never quite certain."""
    if chance >= 0.995:
        return ">99 %"
    return "<1 %" if chance <= 0.005 else f"{100 * chance:.0f} %"


def share(part: float) -> str:
    """A share from 0 to 1 to two decimals; never nothing."""
    return "<0.01" if 0 < part < 0.005 else f"{part:.2f}"


def with_doubt(value: float, sd: float | None, most_decimals: int = 4) -> tuple[str, str]:
    """A value and its standard deviation to the digits the deviation leaves standing."""
    if sd is None:
        return f"{value:.2f}", "-"
    decimals = most_decimals
    if sd > 0:
        decimals = min(most_decimals, max(0, 1 - math.floor(math.log10(sd))))
    least = 10.0**-most_decimals
    shown = f"<{least:.{most_decimals}f}" if sd < least else f"{sd:.{decimals}f}"
    return f"{value:.{decimals}f}", shown


def table(head: Sequence[str], rows: Sequence[Sequence[str]], indent: int = 2) -> list[str]:
    """Columns as wide as their widest cell; the first column to the left, numbers to the right."""
    cells = [list(head), *([clean(cell) for cell in row] for row in rows)]
    widths = [max(len(row[i]) for row in cells) for i in range(len(head))]
    lines = []
    for row in cells:
        parts = [
            cell.rjust(width) if numeric(cells[1:], i) else cell.ljust(width)
            for i, (cell, width) in enumerate(zip(row, widths, strict=True))
        ]
        lines.append((" " * indent + "  ".join(parts)).rstrip())
    return lines


def unwrapped(text: str, indent: int = 2, mark: str = "") -> list[str]:
    """The same in one line, for a screen that wraps by itself."""
    return [" " * indent + mark + clean(text)]


def paragraph(text: str, indent: int = 2, mark: str = "") -> list[str]:
    """One paragraph wrapped to the page; ``mark`` such as ``- `` hangs before it."""
    blank = " " * (indent + len(mark))
    return textwrap.wrap(
        clean(text), WIDTH, initial_indent=" " * indent + mark, subsequent_indent=blank
    )


def numeric(rows: Sequence[Sequence[str]], column: int) -> bool:
    """Whether a column holds numbers, which are set to the right."""
    body = [row[column] for row in rows if row[column]]
    return bool(body) and all(cell[0] in "0123456789+-±<>[" or cell == "rigid" for cell in body)
