"""The first screen: begin a job, open one, take up what was left unsaved."""

from __future__ import annotations

from collections.abc import Sequence
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
from textual.widgets import OptionList, Static
from textual.widgets.option_list import Option

from fieldkit.job.journal import Kept, all_kept
from fieldkit.job.recent import Recent, recents, state_of, title_of
from fieldkit.ui.keeping import when
from fieldkit.ui.start.picker import home_short
from fieldkit.ui.words import count, safe

WELCOME = " fieldkit   why a pipe shakes, and the smallest change that cures it"
WAYS = (
    ("new", "n", "New job", "describe the pipe step by step, drawn as you type"),
    ("open", "o", "Open", "a job file"),
    ("sample", "s", "Sample job", "a pipe that shakes, with its recordings"),
    ("practise", "p", "Practise", "tap a simulated pipe: no sensor needed"),
)
HINT = "↑↓ enter, a click, or the letter in front · ctrl+p commands · q leaves"
MOST_RECENT, MOST_KEPT = 9, 4
NAME_WIDTH = 12


@dataclass(frozen=True)
class Chosen:
    """What to start with: a way, and the file or the unsaved work it is about."""

    way: str
    path: Path | None = None
    kept: Kept | None = None


class StartScreen(ModalScreen[Chosen | None]):
    """Ways to begin, unsaved work, recent jobs."""

    BINDINGS: ClassVar[list[BindingType]] = [
        *(Binding(key, f"go('{way}')", name, show=False, id=f"start.{way}")
          for way, key, name, _ in WAYS),
        Binding("r", "restore", "Take up", show=False, id="start.restore"),
        *(Binding(str(n), f"recent({n - 1})", "Recent", show=False)
          for n in range(1, MOST_RECENT + 1)),
        Binding("escape", "dismiss", "Look around", show=False, id="start.close"),
        Binding("q", "app.quit", "Quit", show=False, id="start.quit"),
    ]  # fmt: skip

    @dataclass
    class Stated(Message):
        """A thread looked into a recent job."""

        path: str
        title: str
        state: str

    def __init__(self) -> None:
        super().__init__()
        self.kept = [kept for kept in all_kept() if kept.stands_alone][:MOST_KEPT]
        self.recent = recents()[:MOST_RECENT]
        self.unsaved = {kept.path for kept in all_kept() if kept.path}
        self.told: dict[str, tuple[str, str]] = {}

    def compose(self) -> ComposeResult:
        """Welcome, one list, keys."""
        with Vertical(id="start"):
            yield Static(WELCOME, markup=False, id="start-title")
            yield OptionList(*self._options(), id="start-list", compact=True)
            yield Static(HINT, markup=False, classes="hint", id="start-hint")

    def on_mount(self) -> None:
        """The list is filled; how far each job has come is looked up behind it."""
        self.query_one(OptionList).focus()
        self.query_one(OptionList).highlighted = 0
        self.look(self.recent)

    def _options(self) -> list[Option | None]:
        shown: list[Option | None] = [Option(_way(*way), id=way[0]) for way in WAYS]
        if self.kept:
            shown += [None, _header("Never saved")]
            shown += [
                Option(_kept_line("r" if not i else " ", kept), id=f"kept-{i}")
                for i, kept in enumerate(self.kept)
            ]
        if self.recent:
            shown += [None, _header("Recent")]
            shown += [
                Option(self._recent_line(i, one), id=f"recent-{i}")
                for i, one in enumerate(self.recent)
            ]
        return shown

    def _recent_line(self, number: int, recent: Recent) -> Content:
        path = Path(recent.path)
        title, state = self.told.get(recent.path, (path.stem, recent.state or "…"))
        if recent.path in self.unsaved:
            state = f"unsaved changes · {state}"
        head = Content.styled(f" {number + 1}  ", "bold $text-accent") + Content(safe(title))
        said = Content.styled(f"\n      {safe(state)}", "$text-muted")
        where = Content.styled(f"  {safe(home_short(path))}", "$text-disabled")
        return head + where + said

    @work(thread=True, exit_on_error=False, group="recent")
    def look(self, entries: Sequence[Recent]) -> None:
        """How far each job has come, one by one."""
        for entry in entries:
            path = Path(entry.path)
            title = title_of(path) if path.exists() else path.stem
            self.post_message(self.Stated(entry.path, title, state_of(path, entry)))

    def on_start_screen_stated(self, message: Stated) -> None:
        """One more is known."""
        self.told[message.path] = (message.title, message.state)
        for number, entry in enumerate(self.recent):
            if entry.path == message.path:
                self.query_one(OptionList).replace_option_prompt(
                    f"recent-{number}", self._recent_line(number, entry)
                )

    def on_option_list_option_selected(self, event: OptionList.OptionSelected) -> None:
        """Enter or a click."""
        name, _, number = (event.option.id or "").partition("-")
        if name == "kept":
            self.dismiss(Chosen("restore", kept=self.kept[int(number)]))
        elif name == "recent":
            self.action_recent(int(number))
        elif name:
            self.action_go(name)

    def action_go(self, way: str) -> None:
        """One of the ways to begin."""
        self.dismiss(Chosen(way))

    def action_restore(self) -> None:
        """The newest of what was never saved."""
        if self.kept:
            self.dismiss(Chosen("restore", kept=self.kept[0]))

    def action_recent(self, number: int) -> None:
        """A job from the list."""
        if number < len(self.recent):
            self.dismiss(Chosen("recent", path=Path(self.recent[number].path)))


def _header(text: str) -> Option:
    return Option(Content.styled(text, "bold"), disabled=True)


def _way(_way_id: str, key: str, name: str, said: str) -> Content:
    return (
        Content.styled(f" {key}  ", "bold $text-accent")
        + Content.styled(f"{name:<{NAME_WIDTH}}", "bold")
        + Content.styled(said, "$text-muted")
    )


def _kept_line(key: str, kept: Kept) -> Content:
    head = Content.styled(f" {key}  ", "bold $text-accent") + Content(safe(kept.title or "New job"))
    return head + Content.styled(f"  {kept_words(kept)}", "$text-muted")


def kept_words(kept: Kept) -> str:
    """``half described, 2 legs · today 14:05``."""
    what = "a whole job"
    if kept.draft:
        legs = len(kept.draft.get("rows", {}).get("leg", ()))
        what = f"half described, {count(legs, 'leg')}" if legs else "half described"
    return f"{what} · {when(kept.kept_s)}"
