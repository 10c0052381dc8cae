"""Picking a file: what was opened last, what lies in the folder, or a path as it is typed."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import ClassVar

from textual import work
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical
from textual.content import Content
from textual.message import Message
from textual.screen import ModalScreen
from textual.widgets import DataTable, Input, Static

from fieldkit.ui.table import Row, Table
from fieldkit.ui.words import safe

MOST = 200
HINT = "↑↓ or a click chooses · enter takes it · tab completes · esc goes back"


@dataclass(frozen=True)
class Place:
    """One line of the list."""

    path: Path
    name: str
    """What it is called in the list."""
    folder: bool = False
    said: str = ""
    """What is known of it before it is looked into."""


Describe = Callable[[Path], str]
"""Looks into a file; runs in a thread and never raises."""


class FilePicker(ModalScreen[Path | None]):
    """Names a file that exists."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "dismiss", "Back", id="picker.back"),
        Binding("down", "step(1)", show=False, priority=True, id="picker.next"),
        Binding("up", "step(-1)", show=False, priority=True, id="picker.before"),
        Binding("pagedown", "step(8)", show=False, priority=True, id="picker.far"),
        Binding("pageup", "step(-8)", show=False, priority=True, id="picker.far-back"),
        Binding("tab", "complete", show=False, priority=True, id="picker.complete"),
    ]

    @dataclass
    class Described(Message):
        """A thread looked into a file."""

        path: Path
        said: str

    def __init__(
        self,
        title: str,
        folder: Path,
        suffixes: Iterable[str],
        describe: Describe,
        recent: Sequence[Place] = (),
        what: str = "file",
    ) -> None:
        super().__init__()
        self.heading = title
        self.folder = folder
        self.suffixes = tuple(suffixes)
        self.describe = describe
        self.recent = tuple(recent)
        self.what = what
        self.said: dict[Path, str] = {}
        self._shown: list[Place] = []

    def compose(self) -> ComposeResult:
        """Title, path, list, keys."""
        with Vertical(classes="window wide-window picker-window"):
            yield Static(safe(self.heading), markup=False, classes="window-title")
            yield Input(placeholder="type to narrow the list, or a path", compact=True)
            yield Static("", markup=False, id="picker-says")
            yield Table("name", "what it is", "where", id="places")
            yield Static(HINT, markup=False, classes="hint")

    def on_mount(self) -> None:
        """Everything is listed until something is typed."""
        self.query_one(Table).show_header = False
        self.query_one(Table).can_focus = False
        self.query_one(Input).focus()
        self._list("")

    def on_input_changed(self, event: Input.Changed) -> None:
        """The list follows what is typed."""
        self._list(event.value)

    def _list(self, typed: str) -> None:
        self._shown = list(self._matching(typed))[:MOST]
        self._fill()
        self._say(typed)
        self.look([place.path for place in self._shown if not place.folder and not place.said])

    def _matching(self, typed: str) -> Iterable[Place]:
        folder, name = split_path(typed, self.folder)
        wanted = name.lower()
        if folder == self.folder:
            for place in self.recent:
                if wanted in f"{place.name} {place.path}".lower():
                    yield place
        known = {place.path for place in self.recent} if folder == self.folder else set()
        for place in listing(folder, self.suffixes):
            if wanted in place.name.lower() and place.path not in known:
                yield place

    def _fill(self) -> None:
        self.query_one(Table).fill(self._row(place) for place in self._shown)

    def _row(self, place: Place) -> Row:
        said = "folder" if place.folder else (self.said.get(place.path) or place.said or "…")
        where = "" if place.folder else home_short(place.path.parent)
        return str(place.path), (place.name, said, where)

    def _say(self, typed: str) -> None:
        folder, name = split_path(typed, self.folder)
        says = f"in {home_short(folder)}"
        if not folder.is_dir():
            says = f"there is no folder {home_short(folder)}"
        elif not self._shown:
            says = f"no {self.what} {'named so ' if name else ''}in {home_short(folder)}"
        self.query_one("#picker-says", Static).update(Content(safe(says)))

    @work(thread=True, exclusive=True, exit_on_error=False, group="picker")
    def look(self, paths: Sequence[Path]) -> None:
        """Look into the files, one by one."""
        for path in paths:
            if path not in self.said:
                self.post_message(self.Described(path, self.describe(path)))

    def on_file_picker_described(self, message: Described) -> None:
        """One more file is known."""
        self.said[message.path] = message.said
        self._fill()

    def action_step(self, step: int) -> None:
        """Another line of the list."""
        table = self.query_one(Table)
        last = max(0, table.row_count - 1)
        table.move_cursor(row=min(last, max(0, table.cursor_row + step)))

    @property
    def _pointed(self) -> Place | None:
        at = self.query_one(Table).cursor_row
        return self._shown[at] if 0 <= at < len(self._shown) else None

    def action_complete(self) -> None:
        """The line pointed at into the input."""
        if self._pointed is not None:
            self._type(self._pointed)

    def _type(self, place: Place) -> None:
        box = self.query_one(Input)
        box.value = f"{place.path}{os.sep if place.folder else ''}"
        box.cursor_position = len(box.value)

    def on_input_submitted(self, event: Input.Submitted) -> None:
        """A path that exists, else what is pointed at."""
        typed = event.value.strip()
        path = (self.folder / Path(typed).expanduser()) if typed else None
        if path is not None and path.is_file():
            self.dismiss(path)
        else:
            self._take(self._pointed)

    def on_data_table_row_selected(self, event: DataTable.RowSelected) -> None:
        """A click on a line."""
        if 0 <= event.cursor_row < len(self._shown):
            self._take(self._shown[event.cursor_row])

    def _take(self, place: Place | None) -> None:
        if place is None:
            return
        if place.folder:
            self._type(place)
        elif place.path.is_file():
            self.dismiss(place.path)


def split_path(typed: str, folder: Path) -> tuple[Path, str]:
    """(folder to list, what the names must hold) of what was typed."""
    head, slash, name = typed.replace(os.sep, "/").rpartition("/")
    if not slash:
        return folder, name
    return folder / Path(f"{head}/").expanduser(), name


def listing(folder: Path, suffixes: tuple[str, ...]) -> list[Place]:
    """Fitting files of a folder, then its folders; empty where it cannot be read."""
    try:
        entries = sorted(folder.iterdir(), key=lambda entry: entry.name.lower())
        seen = [entry for entry in entries if not entry.name.startswith(".")][: 10 * MOST]
        files = [e for e in seen if e.suffix.lower() in suffixes and e.is_file()]
        folders = [e for e in seen if e.is_dir()]
    except OSError:
        return []
    up = [Place(folder.parent, "..", folder=True)] if folder.parent != folder else []
    return [
        *(Place(file, file.name) for file in files),
        *up,
        *(Place(one, f"{one.name}/", folder=True) for one in folders),
    ]


def home_short(path: Path) -> str:
    """A path as people write it: ``~`` for their own folder."""
    try:
        return str(Path("~") / path.resolve().relative_to(Path.home()))
    except (ValueError, OSError, RuntimeError):
        return str(path)
