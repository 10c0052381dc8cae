"""What every live screen shares: it begins and ends in the background, and polls in between."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import ClassVar, Generic, Protocol, TypeVar

from textual import work
from textual.binding import Binding, BindingType
from textual.message import Message
from textual.screen import ModalScreen
from textual.widgets import Static

from fieldkit.errors import FieldkitError
from fieldkit.ui.capture.bench import in_background
from fieldkit.ui.capture.big_words import big
from fieldkit.ui.capture.takes import Result, Take
from fieldkit.ui.commands import help_text
from fieldkit.ui.dialogs import AskScreen, TextScreen
from fieldkit.ui.widgets import SpectrumPlot
from fieldkit.ui.widgets.glyphs import plain_terminal
from fieldkit.ui.words import SIMULATED, safe
from fieldkit.ui.work import unexpected

POLL_S = 1 / 12


LEAVING_KEYS: list[BindingType] = [
    Binding("question_mark", "help", "Keys", key_display="?", id="live.help",
            tooltip="List these keys"),
    Binding("escape", "leave", "Leave", priority=True, id="live.leave",
            tooltip="Leave; the recording stays on the disk"),
    Binding("ctrl+q", "leave_app", "Quit", show=False, priority=True, id="live.quit",
            tooltip="End the recording safely, then leave the app"),
]  # fmt: skip
"""The last keys of every live screen."""


class Run(Protocol):
    """What a live screen steers."""

    def stop(self) -> None:
        """End it; returns at once."""

    def finish(self) -> tuple[Take, ...]:
        """End it, and wait until all is on the disk."""

    @property
    def trouble(self) -> str:
        """What ended it early."""


R = TypeVar("R", bound=Run)
Begin = Callable[[], R]


@dataclass
class Begun(Message):
    """The source is made; ``refused`` says why it is not."""

    refused: str = ""


@dataclass
class Finished(Message):
    """All is on the disk."""

    takes: tuple[Take, ...]


class LiveScreen(ModalScreen[Result], Generic[R]):
    """A full screen over a run; whatever happens, leaving it ends the run."""

    TITLE: ClassVar[str]
    KEEP: ClassVar[str]
    """The answer that takes it into the job."""
    GO_ON: ClassVar[str]
    """The answer that goes on measuring."""

    def __init__(self, begin: Begin[R]) -> None:
        """``begin`` may take seconds, and raise InputError or Refusal."""
        super().__init__()
        self._begin = begin
        self.run: R | None = None
        self.refused = ""
        """Why there is no run."""
        self.adding: bool | None = None
        """Whether the takes go into the job, once it is to end."""
        self._gone = self._asking = self._quits = False
        self._said: dict[str, object] = {}

    def on_mount(self) -> None:
        """Begin, and look ten times a second."""
        self.set_interval(POLL_S, self.poll)
        self.poll()
        in_background(self, self._begun)

    def on_unmount(self) -> None:
        """Nothing runs on behind a screen that is gone."""
        self._gone = True
        if self.run is not None:
            self.run.stop()

    def _begun(self) -> Message:
        try:
            self.run = self._begin()
        except FieldkitError as error:
            return Begun(str(error))
        except Exception as error:
            return Begun(unexpected(error))
        if self._gone:
            self.run.stop()
        return Begun()

    def on_begun(self, message: Begun) -> None:
        """There is something to show, or a reason why not."""
        self.refused = message.refused
        self.poll()

    def poll(self) -> None:
        """Show how things are."""
        raise NotImplementedError

    def unsaved(self) -> str:
        """What would not reach the job, the beginning of a sentence; empty where nothing would."""
        raise NotImplementedError

    @work
    async def action_leave(self) -> None:
        """Leave; asks where something would not reach the job."""
        await self._leave(quits=False)

    @work
    async def action_leave_app(self) -> None:
        """As leaving, and then the app ends too."""
        await self._leave(quits=True)

    async def _leave(self, *, quits: bool) -> None:
        if self._asking:
            return
        unsaved = self.unsaved() if self.adding is None else ""
        if not unsaved:
            self._quits |= quits
            self.end(add=False)
            return
        question = f"{unsaved} would not reach the job. The recording stays on the disk either way."
        answers = (("keep", self.KEEP), ("leave", "Leave, job unchanged"), ("back", self.GO_ON))
        self._asking = True
        answer = await self.app.push_screen_wait(AskScreen(question, answers))
        self._asking = False
        if answer != "back":
            self._quits |= quits
            self.end(add=answer == "keep")

    def action_help(self) -> None:
        """List every key."""
        plot = ("In the spectrum", self.query_one("#live-spectrum", SpectrumPlot).BINDINGS)
        self.app.push_screen(TextScreen("Keys", help_text([(self.TITLE, self.BINDINGS), plot])))

    def end(self, *, add: bool) -> None:
        """Stop, and leave once all is on the disk."""
        run = self.run
        if run is None:
            self.dismiss(Result(again=True, quits=self._quits))
        elif self.adding is None:
            self.adding = add
            self.poll()
            in_background(self, lambda: Finished(run.finish()))

    def on_finished(self, message: Finished) -> None:
        """Leave."""
        trouble = self.run.trouble if self.run else ""
        add = bool(self.adding)
        useful = any(take.usable for take in message.takes)
        again = not add and not useful
        self.dismiss(Result(message.takes, add, again, trouble, self._quits))

    def say(self, selector: str, content: object) -> None:
        """Write into a widget, where it says something else than before."""
        if self._said.get(selector) != content:
            self._said[selector] = content
            self.query_one(selector, Static).update(
                safe(content) if isinstance(content, str) else content  # type: ignore[arg-type]
            )

    def say_big(self, words: str, tone: str) -> None:
        """The large words, and their colour."""
        banner = self.query_one("#big", Static)
        if self._said.get("#big") != (words, tone):
            self._said["#big"] = (words, tone)
            banner.update("\n".join(big(words, plain=plain_terminal())))
            self.query_one("#banner").set_classes(f"-{tone}")

    def title_line(self, title: str, simulated: bool) -> str:
        """What it is, and that it is no measurement."""
        return f" {SIMULATED}  {title}" if simulated else f" {title}"
