"""What is wrong in a job file, shown at its line, with the way to mend it."""

from __future__ import annotations

from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical
from textual.content import Content
from textual.screen import ModalScreen
from textual.widgets import Button, Static

from fieldkit.errors import FieldkitError, InputError
from fieldkit.ui.words import safe, sentence

LINES_AROUND = 4


class BrokenScreen(ModalScreen[str]):
    """The sentence, the lines around, and whether to edit; escape leaves."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "dismiss('back')", "Back", id="broken.back"),
        Binding("e", "dismiss('edit')", "Edit", id="broken.edit"),
        Binding("left,up", "app.focus_previous", show=False),
        Binding("right,down", "app.focus_next", show=False),
    ]

    def __init__(self, title: str, error: FieldkitError, text: str, leave: str) -> None:
        """``leave`` names the way out, such as ``Throw my changes away``."""
        super().__init__()
        self.heading = title
        self.error = error
        self.text = text
        self.leave = leave

    def compose(self) -> ComposeResult:
        """Sentence, lines, buttons."""
        with Vertical(classes="window wide-window broken-window"):
            yield Static(safe(self.heading), markup=False, classes="window-title")
            yield Static(safe(_told(self.error)), markup=False, classes="broken-says")
            yield Static(excerpt(self.text, line_of(self.error)), markup=False, id="excerpt")
            with Horizontal(classes="buttons"):
                yield Button(Content("Edit it (e)"), id="edit", compact=True)
                yield Button(Content(f"{self.leave} (esc)"), id="back", compact=True)

    def on_button_pressed(self, event: Button.Pressed) -> None:
        """The answer is the button's id."""
        self.dismiss(event.button.id or "back")


def line_of(error: FieldkitError) -> int | None:
    """The line a fault stands on, from 1."""
    return error.place.line if isinstance(error, InputError) else None


def _told(error: FieldkitError) -> str:
    if not isinstance(error, InputError):
        return sentence(str(error))
    place = error.place
    where = [f"Line {place.line}"] if place.line else []
    where += [place.field] if place.field else []
    said = f"{error.what}; {error.remedy}" if error.remedy else error.what
    return sentence(f"{', '.join(where)}: {said}" if where else said)


def excerpt(text: str, line: int | None) -> Content:
    """The lines around a fault with their numbers, the line itself marked."""
    lines = text.splitlines()
    here = min(max(line or 1, 1), max(len(lines), 1))
    first = max(1, here - LINES_AROUND)
    shown = Content("")
    for number in range(first, min(len(lines), here + LINES_AROUND) + 1):
        marked = line is not None and number == here
        row = f"{'▶' if marked else ' '} {number:>4}  {safe(lines[number - 1])}\n"
        shown += Content.styled(row, "bold $text-error") if marked else Content(row)
    return shown
