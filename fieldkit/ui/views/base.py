"""What every view has: a name, a way to take the desk, and a widget where the keyboard starts."""

from __future__ import annotations

from textual.containers import Container
from textual.widgets import Static

from fieldkit.ui.desk import Desk
from fieldkit.ui.table import Table
from fieldkit.ui.words import safe


class View(Container):
    """One step of the work."""

    NAME = ""
    HOME = ""
    """Selector of the widget that gets the focus."""

    def __init__(self) -> None:
        super().__init__(id=self.NAME, classes="view")
        self.desk = Desk()

    def show(self, desk: Desk) -> None:
        """Take what lies on the desk and draw it."""
        self.desk = desk
        if self.is_mounted:
            self.draw()

    def on_mount(self) -> None:
        """Draw what came before the widgets were there."""
        self.draw()

    def draw(self) -> None:
        """Fill the widgets from ``self.desk``."""
        raise NotImplementedError

    def focus_home(self) -> None:
        """Put the keyboard where the work of this view starts."""
        self.query_one(self.HOME).focus()

    def table(self, selector: str) -> Table:
        """One of its tables."""
        return self.query_one(selector, Table)

    def write(self, selector: str, text: str) -> None:
        """Put plain text into one of its static widgets."""
        self.query_one(selector, Static).update(safe(text))


def plain(id: str, classes: str | None = None) -> Static:
    """A text that is never parsed as markup: it may come from a file."""
    return Static("", markup=False, id=id, classes=classes)
