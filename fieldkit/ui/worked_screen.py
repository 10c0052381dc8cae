"""A window whose text is worked out in a thread once it is open."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, ClassVar

from textual import work
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical, VerticalScroll
from textual.screen import ModalScreen
from textual.widgets import Static

from fieldkit.errors import FieldkitError
from fieldkit.ui.words import safe, sentence

if TYPE_CHECKING:
    from fieldkit.detune.verdict import Verdict
    from fieldkit.job.document import Job
    from fieldkit.workup import Workup

WORKING = "Working it out ..."
INSTALL, SPACING = "What it takes to install change {}", "Equal spacing of supports"
BAR = 14


class WorkedScreen(ModalScreen[None]):
    """Title, a text that scrolls, keys; any of escape, enter and q closes it."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape,enter,q", "dismiss", "Close", priority=True, id="worked.close"),
    ]

    def __init__(self, title: str, answer: Callable[[], list[str]]) -> None:
        """``answer`` gives the lines; it runs in a thread and may raise FieldkitError."""
        super().__init__()
        self.heading = title
        self.answer = answer

    def compose(self) -> ComposeResult:
        """Title above, scrolling text below."""
        with Vertical(classes="window wide-window"):
            yield Static(safe(self.heading), markup=False, classes="window-title")
            with VerticalScroll(can_focus=True):
                yield Static(WORKING, markup=False, id="worked-text")
            yield Static("esc closes · ↑↓ scroll", markup=False, classes="hint")

    def on_mount(self) -> None:
        """Start the thread."""
        self.work_out()

    @work(thread=True, exit_on_error=False, group="worked")
    def work_out(self) -> None:
        """The text, or why there is none in one sentence."""
        from fieldkit.ui.work import unexpected

        try:
            text = "\n".join(self.answer())
        except FieldkitError as error:
            text = sentence(str(error))
        except Exception as error:
            text = sentence(unexpected(error))
        if self.is_attached:
            self.app.call_from_thread(self.show, text)

    def show(self, text: str) -> None:
        """Put the text on screen."""
        if self.is_attached:
            self.query_one("#worked-text", Static).update(safe(text))


def install_window(work: Workup, fix: Verdict) -> WorkedScreen:
    """Stiffness, brackets, heat, line at rest and cautions of one change."""

    def answer() -> list[str]:
        from fieldkit.sheet.installing import lines
        from fieldkit.sheet.plain import unwrapped
        from fieldkit.workup.installing import installing

        parts = installing(work, [fix])[fix.rank]
        return [sentence(fix.summary), "", *lines(parts, work.job.units, unwrapped)]

    return WorkedScreen(INSTALL.format(fix.rank), answer)


def spacing_window(job: Job, work: Workup | None) -> WorkedScreen:
    """Frequency against equal spacing, supports as the tap found them."""

    def answer() -> list[str]:
        from fieldkit.sheet.plain import unwrapped
        from fieldkit.sheet.spacing import lines
        from fieldkit.workup.spacing import spacing

        return lines(spacing(job, work.match if work else None), job.units, unwrapped, BAR)

    return WorkedScreen(SPACING, answer)
