"""Small windows: a question, a text, a choice, a file path."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical, VerticalScroll
from textual.content import Content
from textual.screen import ModalScreen
from textual.suggester import Suggester
from textual.widgets import Button, Input, OptionList, Static
from textual.widgets.option_list import Option

from fieldkit.ui.words import safe


class AskScreen(ModalScreen[str]):
    """A question with two or three answers; escape gives the last, the harmless one."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "harmless", "Back", id="ask.back"),
        Binding("left,up", "app.focus_previous", show=False),
        Binding("right,down", "app.focus_next", show=False),
    ]

    def __init__(self, question: str, answers: Sequence[tuple[str, str]]) -> None:
        """``answers``: (id, label) pairs, the harmless one last."""
        super().__init__()
        self.question = question
        self.answers = answers

    def compose(self) -> ComposeResult:
        """Question above, buttons below."""
        with Vertical(classes="window"):
            yield Static(safe(self.question), markup=False, classes="question")
            with Horizontal(classes="buttons"):
                for name, label in self.answers:
                    yield Button(Content(label), id=name, compact=True)

    def on_button_pressed(self, event: Button.Pressed) -> None:
        """The answer is the button's id."""
        self.dismiss(event.button.id)

    def action_harmless(self) -> None:
        """Leave without doing anything."""
        self.dismiss(self.answers[-1][0])


class TextScreen(ModalScreen[None]):
    """A text to read; any of escape, enter and q closes it."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape,enter,q", "dismiss", "Close", id="text.close"),
    ]

    def __init__(self, title: str, text: str) -> None:
        super().__init__()
        self.heading = title
        self.text = text

    def compose(self) -> ComposeResult:
        """Title above, scrolling text below."""
        with Vertical(classes="window reading-window"):
            yield Static(safe(self.heading), markup=False, classes="window-title")
            with VerticalScroll(can_focus=True):
                yield Static(safe(self.text), markup=False)
            yield Static("esc closes · ↑↓ scroll", markup=False, classes="hint")


class PickScreen(ModalScreen[str | None]):
    """One of several."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "dismiss", "Back", id="pick.back"),
    ]

    def __init__(self, title: str, options: Sequence[tuple[str, str]]) -> None:
        """``options``: (id, label) pairs."""
        super().__init__()
        self.heading = title
        self.options = options

    def compose(self) -> ComposeResult:
        """Title above, list below."""
        with Vertical(classes="window"):
            yield Static(safe(self.heading), markup=False, classes="window-title")
            yield OptionList(
                *(Option(Content(label), id=name) for name, label in self.options), compact=True
            )
            yield Static("enter picks · esc goes back", markup=False, classes="hint")

    def on_option_list_option_selected(self, event: OptionList.OptionSelected) -> None:
        """The answer is the option's id."""
        self.dismiss(event.option.id)


def key_button(name: str, label: str) -> Button:
    """A button for the mouse: the keyboard has keys of its own for it."""
    button = Button(Content(label), id=name, compact=True)
    button.can_focus = False
    return button


class PathSuggester(Suggester):
    """Completes a path from what is on the disk, folders and job files first."""

    def __init__(self) -> None:
        super().__init__(use_cache=False, case_sensitive=True)

    async def get_suggestion(self, value: str) -> str | None:
        """The first entry that starts as typed."""
        head, _, tail = value.rpartition("/")
        folder = Path(f"{head}/" if value.startswith("/") or head else ".").expanduser()
        try:
            names = sorted(
                folder.iterdir(), key=lambda entry: (entry.suffix != ".toml", entry.name)
            )
        except OSError:
            return None
        for entry in names:
            if tail and entry.name.startswith(tail):
                slash = "/" if entry.is_dir() else ""
                return value[: len(value) - len(tail)] + entry.name + slash
        return None


class PathScreen(ModalScreen[Path | None]):
    """Asks for a file path; the right arrow completes what is greyed out."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "dismiss", "Back", id="path.back"),
        Binding("tab", "complete", "Complete", id="path.complete", priority=True),
    ]

    def __init__(self, title: str, start: str, must_exist: bool) -> None:
        super().__init__()
        self.heading = title
        self.start = start
        self.must_exist = must_exist

    def compose(self) -> ComposeResult:
        """Title, input, and a line that says what is there."""
        with Vertical(classes="window"):
            yield Static(safe(self.heading), markup=False, classes="window-title")
            yield Input(self.start, suggester=PathSuggester(), select_on_focus=False, compact=True)
            yield Static("", markup=False, id="path-says")
            with Horizontal(classes="keys"):
                yield key_button("take", "Take it")
                yield key_button("back", "Back")
                yield Static(
                    "tab completes · enter takes it · esc goes back", markup=False, classes="hint"
                )

    def action_complete(self) -> None:
        """Take the greyed-out completion."""
        self.query_one(Input).action_cursor_right()

    def on_input_changed(self, event: Input.Changed) -> None:
        """Say at once whether the path exists."""
        self.query_one("#path-says", Static).update(Content(self._says(event.value)))

    def _says(self, value: str) -> str:
        path = Path(value).expanduser()
        if not value.strip():
            return "type a path"
        if path.is_dir():
            return "a folder: go on typing"
        if path.exists():
            return "a file" if self.must_exist else "this file exists and will be replaced"
        return "no such file" if self.must_exist else "a new file"

    def on_button_pressed(self, event: Button.Pressed) -> None:
        """What enter and escape do."""
        if event.button.id == "take":
            self._take(self.query_one(Input).value)
        else:
            self.dismiss(None)

    def on_input_submitted(self, event: Input.Submitted) -> None:
        """Take the path where it makes sense."""
        self._take(event.value)

    def _take(self, typed: str) -> None:
        path = Path(typed).expanduser()
        if not typed.strip() or path.is_dir() or (self.must_exist and not path.exists()):
            return
        self.dismiss(path)
