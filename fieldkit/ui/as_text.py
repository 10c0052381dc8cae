"""A view as plain text: everything on it, in the order it stands, for a reader or a clipboard."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Protocol, runtime_checkable

from rich.cells import cell_len
from textual.widget import Widget
from textual.widgets import DataTable, Static

from fieldkit.ui.widgets.drawing import Drawing
from fieldkit.ui.widgets.raster import Canvas

COLUMNS, ROWS = 100, 18
RULER_ROWS = 5


@runtime_checkable
class Told(Protocol):
    """A screen that tells in words what it draws."""

    def as_text(self) -> list[str]:
        """Everything on it, line by line."""


def view_text(widgets: Iterable[Widget]) -> str:
    """The texts, tables and drawings under some widgets, hidden ones among them."""
    blocks = [block for widget in widgets for block in _blocks(widget)]
    return "\n\n".join(block for block in blocks if block.strip())


def _blocks(widget: Widget) -> list[str]:
    if isinstance(widget, DataTable):
        return [table_text(widget)]
    if isinstance(widget, Drawing):
        return [drawing_text(widget)]
    if isinstance(widget, Static):
        return [str(widget.render())]
    return [block for child in widget.children for block in _blocks(child)]


def drawing_text(drawing: Drawing) -> str:
    """A drawing at a size of its own, in ASCII where the terminal knows no more."""
    canvas = Canvas(COLUMNS, RULER_ROWS if drawing.id == "ruler" else ROWS)
    drawing.draw(canvas)
    return "\n".join(line.rstrip() for line in canvas.lines(plain=drawing.plain))


def table_text(table: DataTable[object]) -> str:
    """Every row and column, in even columns."""
    head = [str(column.label) for column in table.ordered_columns]
    rows = [[str(cell) for cell in table.get_row_at(i)] for i in range(table.row_count)]
    return aligned([head, *rows]) if rows else ""


def aligned(rows: Sequence[Sequence[str]]) -> str:
    """Cells in even columns."""
    width = [max(map(cell_len, column)) for column in zip(*rows, strict=True)]
    return "\n".join(
        "  ".join(
            cell + " " * (w - cell_len(cell)) for cell, w in zip(row, width, strict=True)
        ).rstrip()
        for row in rows
    )
