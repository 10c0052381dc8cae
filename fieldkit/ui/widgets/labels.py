"""Put labels beside their points so that none covers another."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from rich.cells import cell_len

from fieldkit.ui.widgets.raster import Canvas

STEM = "┊"


@dataclass(frozen=True)
class Label:
    """A glyph that stands exactly at ``column``, and words beside it, the longest first."""

    column: int
    glyph: str
    wordings: tuple[str, ...]
    ink: str


@dataclass(frozen=True)
class Placed:
    """A label where it is to be written; row 0 is the one nearest to what it labels."""

    row: int
    start: int
    text: str
    label: Label

    @property
    def end(self) -> int:
        """One past its last cell."""
        return self.start + cell_len(self.text)


def arrange(labels: Sequence[Label], rows: int, columns: int) -> list[Placed]:
    """Place as many labels as possible, those that come first with their longest wording.

    The rest get their shortest; where even that finds no room the bare glyph stands in row 0, and
    two glyphs of one column become one.
    """
    if rows <= 0:
        return []
    placed = _placed(labels, 0, rows, columns)
    if len(placed) < len(labels):
        return _lengthened([*placed, *_bare(labels, placed)], rows, columns)
    fewest, most = 0, len(labels)
    while fewest < most:
        tried = (fewest + most + 1) // 2
        attempt = _placed(labels, tried, rows, columns)
        if len(attempt) == len(labels):
            fewest, placed = tried, attempt
        else:
            most = tried - 1
    return _lengthened(placed, rows, columns)


def _lengthened(placed: list[Placed], rows: int, columns: int) -> list[Placed]:
    """Each label that still has room gets its longest wording, the others left where they are."""
    for index, here in enumerate(placed):
        others = placed[:index] + placed[index + 1 :]
        longer = _first_room(here.label, here.label.wordings[0], others, rows, columns)
        if longer is not None:
            placed = [*placed[:index], longer, *placed[index + 1 :]]
    return placed


def _placed(labels: Sequence[Label], in_full: int, rows: int, columns: int) -> list[Placed]:
    """The labels that find room when the first ``in_full`` are written in full."""
    placed: list[Placed] = []
    for index, label in enumerate(labels):
        wording = label.wordings[0 if index < in_full else -1]
        found = _first_room(label, wording, placed, rows, columns)
        if found is not None:
            placed.append(found)
    return placed


def _first_room(
    label: Label, wording: str, taken: Sequence[Placed], rows: int, columns: int
) -> Placed | None:
    right = Placed(0, label.column, f"{label.glyph}{wording}", label)
    left = Placed(0, label.column - cell_len(wording), f"{wording}{label.glyph}", label)
    for row in range(rows):
        for there in (right, left):
            inside = there.start >= 0 and there.end <= columns
            if inside and not _touches(row, there.start, there.end, taken):
                return Placed(row, there.start, there.text, label)
    return None


def _touches(row: int, start: int, end: int, taken: Sequence[Placed]) -> bool:
    return any(p.row == row and start <= p.end and p.start <= end for p in taken)


def _bare(labels: Sequence[Label], placed: Sequence[Placed]) -> list[Placed]:
    words = {id(p.label) for p in placed}
    bare: list[Placed] = []
    for label in labels:
        column = label.column
        covered = any(p.row == 0 and p.start <= column < p.end for p in [*placed, *bare])
        if id(label) not in words and not covered:
            bare.append(Placed(0, column, label.glyph, label))
    return bare


def write_labels(canvas: Canvas, labels: Sequence[Label], rows: Sequence[int]) -> None:
    """Write labels into ``rows`` of the canvas, the nearest to what they label first."""
    placed = arrange(labels, len(rows), canvas.columns)
    for label in placed:
        canvas.write(rows[label.row], label.start, label.text, label.label.ink)
    for label in placed:
        for row in rows[: label.row]:
            column = label.label.column
            if canvas.free(row, max(0, column - 1), min(canvas.columns, column + 2)):
                canvas.write(row, column, STEM, label.label.ink)


def write_ticks(
    canvas: Canvas, row: int, places: Sequence[tuple[int, str]], ink: str, *, first: int, end: int
) -> None:
    """Numbers centred under their ticks between two columns; one that would touch is left out."""
    for column, text in places:
        start = min(max(first, column - len(text) // 2), end - len(text))
        if start >= first and canvas.free(row, max(0, start - 1), start + len(text)):
            canvas.write(row, start, text, ink)
