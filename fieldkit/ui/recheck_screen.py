"""Recheck over the Detune view: recordings made after a change go in, the verdict comes out."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any, ClassVar

from textual import work
from textual.app import App, ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical, VerticalScroll
from textual.screen import ModalScreen
from textual.widgets import Static
from textual.worker import get_current_worker

from fieldkit.errors import Cancelled, FieldkitError
from fieldkit.progress import Progress
from fieldkit.ui.dialogs import PathScreen, TextScreen
from fieldkit.ui.widgets import BandShade, FrequencyRuler, RulerData
from fieldkit.ui.words import safe, sentence

if TYPE_CHECKING:
    from fieldkit.detune.recheck_answer import Recheck
    from fieldkit.detune.verdict import Verdict
    from fieldkit.ui.desk import Desk
    from fieldkit.workup import Workup
    from fieldkit.workup.rechecking import Rechecked

TITLE = "Recheck of change {}"
FIRST = "Tap recording made after the change"
FURTHER = "Recording {}, or esc when all are named"
READING = "Reading the recordings..."
NOTHING_YET = (
    "A recheck holds a change that was installed against taps made after it. It needs the ranked "
    "changes of the job as it was before: open that job, put the cursor on the change, press p."
)
ROWS = ("re-tap", "now", "promised")
KEYS = "esc closes, or stops the work · ↑↓ scroll"


class RecheckScreen(ModalScreen[None]):
    """Verdict, a ruler with promised and measured modes as the pipe runs, and everything else."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape,q,enter", "dismiss", "Close", priority=True, id="recheck.close"),
    ]

    DEFAULT_CSS = """
    RecheckScreen {
        #recheck-verdict { text-style: bold; }
        #recheck-words { height: 1fr; }
    }
    """

    def __init__(self, workup: Workup, fix: Verdict, files: tuple[Path, ...]) -> None:
        super().__init__()
        self.workup = workup
        self.fix = fix
        self.files = files
        self.found: Rechecked | None = None

    def compose(self) -> ComposeResult:
        """Title, verdict, ruler, text, keys."""
        with Vertical(classes="window response-window"):
            title = TITLE.format(self.fix.rank or "from the map")
            yield Static(safe(title), markup=False, classes="window-title")
            yield Static(READING, markup=False, id="recheck-verdict")
            yield FrequencyRuler(id="recheck-ruler")
            with VerticalScroll(can_focus=True, id="recheck-words"):
                yield Static("", markup=False, id="recheck-text")
            yield Static(KEYS, markup=False, classes="hint")

    def on_mount(self) -> None:
        """Start the thread; the ruler comes with the answer."""
        self.query_one("#recheck-ruler").display = False
        self.query_one("#recheck-words").focus()
        self.work_out()

    def on_unmount(self) -> None:
        """A window that is closed needs no answer."""
        self.workers.cancel_node(self)

    @work(thread=True, exclusive=True, exit_on_error=False, group="recheck")
    def work_out(self) -> None:
        """Read, hold against the promise, show; or say in a sentence why not."""
        from fieldkit.ui.work import unexpected

        worker = get_current_worker()
        progress = Progress(self._tell_step, lambda: worker.is_cancelled)
        try:
            found = self._rechecked(progress)
        except Cancelled:
            return
        except FieldkitError as error:
            self._call(self.refuse, str(error))
        except Exception as error:
            self._call(self.refuse, unexpected(error))
        else:
            self._call(self.take, found)

    def _rechecked(self, progress: Progress) -> Rechecked:
        from fieldkit.workup.rechecking import rechecked
        from fieldkit.workup.retaps import retaps, state_of_retap

        job = self.workup.job
        return rechecked(
            self.workup, self.fix, retaps(job, self.files), state_of_retap(job), progress
        )

    def _tell_step(self, doing: str, share: float) -> None:
        self._call(self.step, f"{sentence(doing).rstrip('.')}... {100 * share:.0f} %")

    def _call(self, told: Any, *words: object) -> None:
        """On the screen's thread, as long as there is a screen."""
        if self.is_attached and not get_current_worker().is_cancelled:
            self.app.call_from_thread(told, *words)

    def step(self, text: str) -> None:
        """What is being done."""
        if self.is_attached and self.found is None:
            self.query_one("#recheck-verdict", Static).update(safe(text))

    def refuse(self, reason: str) -> None:
        """Why there is no answer, and what to measure."""
        self.query_one("#recheck-verdict", Static).update(safe(sentence(reason)))

    def take(self, found: Rechecked) -> None:
        """Show the answer."""
        from fieldkit.sheet.origin import mark
        from fieldkit.sheet.plain import unwrapped
        from fieldkit.sheet.recheck import lines, verdict_words
        from fieldkit.workup import simulated_files, simulated_notice

        self.found = found
        notice = mark(simulated_notice(simulated_files(found.entries)))
        verdict = "\n".join([*notice, verdict_words(found.answer)])
        self.query_one("#recheck-verdict", Static).update(safe(verdict))
        text = lines(found, unwrapped)[2:]
        self.query_one("#recheck-text", Static).update(safe("\n".join(text)))
        ruler = self.query_one("#recheck-ruler", FrequencyRuler)
        ruler.show(ruler_of(found.answer, self.fix, self.workup.job.goal.up_to_hz))
        ruler.display = True


def ruler_of(answer: Recheck, fix: Verdict, up_to_hz: float) -> RulerData:
    """As the pipe runs: what the re-tap comes to, every mode now, and what was promised."""
    shades = tuple(
        BandShade(b.low_hz, b.high_hz, b.avoid_low_hz, b.avoid_high_hz, safe(b.name))
        for b in answer.bands_measured
    )
    return RulerData(
        up_to_hz,
        shades,
        [mode.median_hz for mode in answer.running if mode.measured_hz is not None],
        [(mode.low_hz, mode.median_hz, mode.high_hz) for mode in answer.running],
        [(mode.low_hz, mode.median_hz, mode.high_hz) for mode in fix.modes_after],
        ROWS,
    )


async def open_recheck(app: App[Any], desk: Desk, fix: Verdict | None) -> None:
    """Ask for the recordings made after the change, one by one, and show the answer."""
    if fix is None or desk.workup is None or desk.workup.detuning is None:
        app.push_screen(TextScreen("Recheck", NOTHING_YET))
        return
    files = await ask_files(app, desk.job.path if desk.job else None)
    if files:
        app.push_screen(RecheckScreen(desk.workup, fix, files))


async def ask_files(app: App[Any], job: Path | None) -> tuple[Path, ...]:
    """Paths until escape; none where the first is not given."""
    files: list[Path] = []
    start = f"{job.parent}/" if job is not None else ""
    while True:
        title = FURTHER.format(len(files) + 1) if files else FIRST
        path = await app.push_screen_wait(PathScreen(title, start, must_exist=True))
        if path is None:
            return tuple(files)
        files.append(path)
        start = f"{path.parent}/"
