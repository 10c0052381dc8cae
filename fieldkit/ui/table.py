"""A table whose cells are plain text, never markup, and which keeps its cursor when refilled."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from rich.text import Text
from textual.coordinate import Coordinate
from textual.widgets import DataTable

from fieldkit.ui.words import safe

Cell = str | Text
Row = tuple[str, Sequence[Cell]]
"""(key, cells)."""


class Table(DataTable[Text]):
    """Rows chosen by the up and down keys."""

    def __init__(self, *columns: str, id: str | None = None, classes: str | None = None) -> None:
        super().__init__(
            cursor_type="row",
            id=id,
            classes=classes,
            cell_padding=1,
            cursor_foreground_priority="css",
        )
        self._titles = columns
        self._rows: list[Row] = []

    def on_mount(self) -> None:
        """Columns stand before the first row comes."""
        for title in self._titles:
            self.add_column(Text(title), key=title)

    def fill(self, rows: Iterable[Row]) -> None:
        """Replace all rows; the cursor stays on the row of the same key, or at the same height."""
        fresh = list(rows)
        if fresh == self._rows:
            return
        chosen, height = self.chosen, self.cursor_row
        self._rows = fresh
        self.clear()
        texts = [[_plain(cell) for cell in cells] for _, cells in fresh]
        self._widen(texts)
        for line in texts:
            self.add_row(*line)
        keys = [key for key, _ in fresh]
        row = keys.index(chosen) if chosen in keys else min(height, len(keys) - 1)
        if row > 0:
            self.cursor_coordinate = Coordinate(row, 0)

    def _widen(self, texts: Sequence[Sequence[Text]]) -> None:
        """Columns as wide as what is about to come.

        The table measures new rows when it is idle; a row drawn before that is kept as it was
        drawn, cut to the old width.
        """
        for column, cells in zip(self.ordered_columns, zip(*texts, strict=True), strict=False):
            widest = max(cell.cell_len for cell in cells)
            column.content_width = max(column.content_width, widest)

    @property
    def chosen(self) -> str | None:
        """Key of the row under the cursor."""
        if not 0 <= self.cursor_row < len(self._rows):
            return None
        return self._rows[self.cursor_row][0]

    def choose(self, key: str) -> None:
        """Put the cursor on a row."""
        keys = [row_key for row_key, _ in self._rows]
        if key in keys and self.chosen != key:
            self.move_cursor(row=keys.index(key))


def _plain(cell: Cell) -> Text:
    return cell if isinstance(cell, Text) else Text(safe(cell))
