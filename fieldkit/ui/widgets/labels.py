"""Put labels beside their points so that none covers another."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from rich.cells import cell_len

from fieldkit.ui.widgets.raster import Canvas


@dataclass(frozen=True)
class Label:
    """A glyph that stands exactly at ``column``, and words beside it, the longest first."""

    column: int
    glyph: str
    wordings: tuple[str, ...]
    ink: str


def write_labels(canvas: Canvas, labels: Sequence[Label], rows: Sequence[int]) -> int:
    """Write labels into the first of ``rows`` that has room, those that come first before others.

    A wording that fits nowhere gives way to a shorter one, and at last to the bare glyph.

    Returns:
        How many of the rows were used.
    """
    used = 0
    for label in labels:
        for wording in (*label.wordings, ""):
            place = _place(canvas, label, wording, rows)
            if place is not None:
                row, column, text = place
                canvas.write(row, column, text, label.ink)
                used = max(used, list(rows).index(row) + 1)
                break
    return used


def _place(
    canvas: Canvas, label: Label, wording: str, rows: Sequence[int]
) -> tuple[int, int, str] | None:
    right = f"{label.glyph}{wording}"
    left = f"{wording}{label.glyph}"
    starts = ((label.column, right), (label.column - cell_len(wording), left))
    for row in rows:
        for start, text in starts[: 2 if wording else 1]:
            if _has_room(canvas, row, start, text):
                return row, start, text
    return None


def _has_room(canvas: Canvas, row: int, start: int, text: str) -> bool:
    """Inside the picture, with a blank cell kept to either neighbour."""
    end = start + cell_len(text)
    if start < 0 or end > canvas.columns:
        return False
    return canvas.free(row, max(0, start - 1), min(canvas.columns, end + 1))


def write_ticks(
    canvas: Canvas, row: int, places: Sequence[tuple[int, str]], ink: str, *, first: int, end: int
) -> None:
    """Numbers centred under their ticks between two columns; one that would touch is left out."""
    for column, text in places:
        start = min(max(first, column - len(text) // 2), end - len(text))
        if start >= first and _has_room(canvas, row, start, text):
            canvas.write(row, start, text, ink)
