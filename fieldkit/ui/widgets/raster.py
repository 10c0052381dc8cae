"""Draw with braille dots, patterns and text on a grid of terminal cells.

A cell holds 2 x 4 dots. Dot coordinates count right and down from the top left corner. The
finished picture leaves as rows of runs: stretches of one row that share their ink and ground, the
names under which a widget looks up colours.
"""

from __future__ import annotations

from itertools import pairwise
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray
from rich.cells import cell_len

from fieldkit.ui.widgets.dots import clipped_segments, every_other, steps_along
from fieldkit.ui.widgets.glyphs import PLAIN_BRAILLE, plain_code

BRAILLE = 0x2800
DOT_BITS = np.array([[0x01, 0x08], [0x02, 0x10], [0x04, 0x20], [0x40, 0x80]], dtype=np.uint8)
SPACE = ord(" ")
WIDE_TAIL = 0xFFFF
"""Stands in the second cell of a double-width character; a code point no text can hold."""

Floats = NDArray[np.float64]


class Run(NamedTuple):
    """Neighbouring cells of one row that look alike."""

    text: str
    ink: str
    ground: str


class Canvas:
    """A picture of ``columns`` x ``rows`` cells; whatever falls outside is left out.

    Text stands over dots, dots over patterns. Where dots share a cell the later ink wins.
    """

    def __init__(self, columns: int, rows: int) -> None:
        self.columns, self.rows = max(0, columns), max(0, rows)
        shape = (self.rows, self.columns)
        self.dots = np.zeros((4 * self.rows, 2 * self.columns), dtype=bool)
        self._styles = [""]
        self._dot_ink = np.zeros(shape, dtype=np.uint8)
        self._text = np.zeros(shape, dtype=np.uint32)
        self._text_ink = np.zeros(shape, dtype=np.uint8)
        self._pattern = np.full(shape, SPACE, dtype=np.uint32)
        self._pattern_ink = np.zeros(shape, dtype=np.uint8)
        self._ground = np.zeros(shape, dtype=np.uint8)

    @property
    def dot_columns(self) -> int:
        """Width in dots."""
        return 2 * self.columns

    @property
    def dot_rows(self) -> int:
        """Height in dots."""
        return 4 * self.rows

    def points(self, x: ArrayLike, y: ArrayLike, ink: str) -> None:
        """Set single dots at the dots nearest to ``x``, ``y``; NaN is left out."""
        across, down = np.asarray(x, dtype=float), np.asarray(y, dtype=float)
        with np.errstate(invalid="ignore"):
            inside = (across > -0.5) & (across < self.dot_columns - 0.5)
            inside &= (down > -0.5) & (down < self.dot_rows - 0.5)
        columns = np.rint(across[inside]).astype(int)
        rows = np.rint(down[inside]).astype(int)
        self.dots[rows, columns] = True
        self._dot_ink[rows // 4, columns // 2] = self._style(ink)

    def polyline(self, x: ArrayLike, y: ArrayLike, ink: str, *, dash: int = 0) -> None:
        """Join points by straight lines; NaN breaks the line.

        ``dash`` draws that many dots, then leaves out as many; 0 draws a full line.
        """
        starts, ends = clipped_segments(
            np.column_stack([np.asarray(x, dtype=float), np.asarray(y, dtype=float)]),
            self.dot_columns,
            self.dot_rows,
        )
        dots = np.rint(steps_along(starts, ends)).astype(int)
        if dash:
            dots = every_other(dots, dash)
        self.points(dots[:, 0], dots[:, 1], ink)

    def columns_filled(
        self, first_dot_column: int, top: Floats, bottom: Floats, ink: str, *, dash: int = 0
    ) -> None:
        """Fill one dot column after another from ``top`` to ``bottom`` inclusive; NaN fills none.

        ``dash`` leaves out every other group of that many columns.
        """
        count = max(0, min(len(top), self.dot_columns - first_dot_column))
        if count == 0 or self.rows == 0:
            return
        rows = np.arange(self.dot_rows, dtype=np.int32)[:, None]
        with np.errstate(invalid="ignore"):
            drawn = bottom[:count] >= top[:count]
        if dash:
            drawn &= np.arange(count) // dash % 2 == 0
        first = np.where(drawn, np.clip(top[:count], -1, self.dot_rows), 1)
        last = np.where(drawn, np.clip(bottom[:count], -1, self.dot_rows), 0)
        filled = np.zeros_like(self.dots)
        filled[:, first_dot_column : first_dot_column + count] = (
            rows >= np.rint(first).astype(np.int32)
        ) & (rows <= np.rint(last).astype(np.int32))
        self.dots |= filled
        cells = filled.reshape(self.rows, 4, self.columns, 2).any(axis=(1, 3))
        self._dot_ink[cells] = self._style(ink)

    def write(self, row: int, column: int, text: str, ink: str) -> int:
        """Write text over the picture, cut at its edges; returns the column after its last cell.

        Control and zero-width characters are left out, so no text can move the cursor.
        """
        style = self._style(ink)
        for character in text:
            width = _cells(character)
            if width and 0 <= row < self.rows and 0 <= column <= self.columns - width:
                self._put(row, column, character, width)
                self._text_ink[row, column : column + width] = style
            column += width
        return column

    def _put(self, row: int, column: int, character: str, width: int) -> None:
        """Set one character; half a wide one that it leaves beside itself becomes a space."""
        cells = self._text[row]
        end = column + width
        if cells[column] == WIDE_TAIL:
            cells[column - 1] = SPACE
        if end < self.columns and cells[end] == WIDE_TAIL:
            cells[end] = SPACE
        cells[column] = ord(character)
        cells[column + 1 : end] = WIDE_TAIL

    def rule(self, rows: slice, columns: slice, glyph: str, ink: str) -> None:
        """Write one glyph of normal width into every cell of a rectangle."""
        self._text[rows, columns] = ord(glyph)
        self._text_ink[rows, columns] = self._style(ink)

    def pattern(
        self, rows: slice, columns: slice, glyph: str, ink: str, ground: str | None = None
    ) -> None:
        """Fill a rectangle of cells with a glyph that shows wherever nothing else is drawn."""
        self._pattern[rows, columns] = ord(glyph)
        self._pattern_ink[rows, columns] = self._style(ink)
        if ground is not None:
            self._ground[rows, columns] = self._style(ground)

    def ground(self, rows: slice, columns: slice, ground: str) -> None:
        """Colour the ground of a rectangle of cells."""
        self._ground[rows, columns] = self._style(ground)

    def free(self, row: int, first: int, end: int) -> bool:
        """Whether the cells of a row from ``first`` up to ``end`` lie inside and bear no text."""
        if not 0 <= row < self.rows or first < 0 or end > self.columns:
            return False
        return not self._text[row, first:end].any()

    def blank(self, row: int, first: int, end: int) -> bool:
        """Whether these cells lie inside and bear neither text nor dots."""
        if not self.free(row, first, end):
            return False
        return not self.dots[4 * row : 4 * row + 4, 2 * first : 2 * end].any()

    def runs(self, *, plain: bool = False) -> list[list[Run]]:
        """The picture, top row first; ``plain`` keeps to ASCII."""
        if not self.rows or not self.columns:
            return [[] for _ in range(self.rows)]
        codes, ink = self._composed(plain)
        look = ink.astype(np.uint16) * 256 + self._ground
        changes = np.ones(look.shape, dtype=bool)
        changes[:, 1:] = np.diff(look, axis=1) != 0
        lines = np.ascontiguousarray(codes).view(f"<U{self.columns}")[:, 0].tolist()
        return [
            self._runs_of(line, np.flatnonzero(change).tolist(), looks)
            for line, change, looks in zip(lines, changes, look.tolist(), strict=True)
        ]

    def lines(self, *, plain: bool = False) -> list[str]:
        """The picture as text alone."""
        return ["".join(run.text for run in row) for row in self.runs(plain=plain)]

    def _composed(self, plain: bool) -> tuple[NDArray[np.uint32], NDArray[np.uint8]]:
        cells = self.dots.reshape(self.rows, 4, self.columns, 2)
        bits = np.einsum("rxcy,xy->rc", cells, DOT_BITS, dtype=np.uint8, casting="unsafe")
        dotted = bits > 0
        drawn = PLAIN_BRAILLE[bits] if plain else bits.astype(np.uint32) + BRAILLE
        codes = np.where(dotted, drawn, self._pattern)
        ink = np.where(dotted, self._dot_ink, self._pattern_ink)
        written = self._text > 0
        codes = np.where(written, self._text, codes).astype("<u4")
        ink = np.where(written, self._text_ink, ink)
        if plain:
            codes = _plain(codes)
        return codes, np.where((codes == SPACE) & ~written, 0, ink)

    def _runs_of(self, line: str, starts: list[int], look: list[int]) -> list[Run]:
        names = self._styles
        runs = [
            Run(line[start:end], names[look[start] >> 8], names[look[start] & 255])
            for start, end in pairwise([*starts, len(line)])
        ]
        tail = chr(WIDE_TAIL)
        return [r._replace(text=r.text.replace(tail, "")) for r in runs] if tail in line else runs

    def _style(self, name: str) -> int:
        if name not in self._styles:
            self._styles.append(name)
        return self._styles.index(name)


def _cells(character: str) -> int:
    """Width on screen; 0 for what is not to be shown at all."""
    if " " <= character <= "~":
        return 1
    return cell_len(character) if character.isprintable() else 0


def _plain(codes: NDArray[np.uint32]) -> NDArray[np.uint32]:
    strange = np.unique(codes[(codes > 126) & (codes != WIDE_TAIL)])
    for code in strange:
        codes[codes == code] = plain_code(int(code))
    codes[codes == WIDE_TAIL] = SPACE
    return codes
