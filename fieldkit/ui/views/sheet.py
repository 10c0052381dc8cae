"""Sheet: the advice as text, and a key to write the whole sheet to a file."""

from __future__ import annotations

from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import VerticalScroll

from fieldkit.ui.desk import Desk
from fieldkit.ui.views.base import View, plain


class SheetView(View):
    """A text to scroll through."""

    NAME = "sheet"
    HOME = "#sheet-scroll"
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("w", "app.write_sheet", "Write to file", id="sheet.write",
                tooltip="Write the whole sheet: a page with figures, Markdown, or a bundle"),
    ]  # fmt: skip

    def compose(self) -> ComposeResult:
        """One scrolling text."""
        with VerticalScroll(id="sheet-scroll", can_focus=True):
            yield plain("sheet-text")

    def draw(self) -> None:
        """The lines of the advice."""
        self.write("#sheet-text", sheet_text(self.desk) or "No result to write down yet.")


def sheet_text(desk: Desk) -> str:
    """The advice as text; empty while there is no result."""
    if desk.workup is None:
        return ""
    from fieldkit.sheet.advice import lines

    return "\n".join(lines(desk.workup))
