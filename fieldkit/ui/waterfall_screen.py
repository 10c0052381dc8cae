"""The waterfall over the Running view: how the lines of a recording move with time."""

from __future__ import annotations

from typing import TYPE_CHECKING, ClassVar

from textual import events, work
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical
from textual.screen import ModalScreen
from textual.widgets import Static
from textual.worker import get_current_worker

from fieldkit.errors import Cancelled, FieldkitError
from fieldkit.progress import Progress
from fieldkit.sheet.waterfall import at_words, lines, reading, time_text
from fieldkit.ui.widgets import BandShade
from fieldkit.ui.widgets.drawing import Drawing, write_empty
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.waterfall_art import (
    WaterfallData,
    draw_waterfall,
    rows_of_times,
    waterfall_frame,
)
from fieldkit.ui.words import safe, sentence

if TYPE_CHECKING:
    from fieldkit.detune.excitation import Band
    from fieldkit.job.document import RecordingEntry
    from fieldkit.signal.waterfall import Waterfall

KEYS = "↑↓ time · shift far · home strongest · +− depth · esc close"
DEPTHS_DB = (20.0, 30.0, 40.0, 60.0, 80.0)
FAR = 10


class WaterfallDrawing(Drawing):
    """The picture with a cursor."""

    COMPONENT_PREFIX = "waterfall"
    COMPONENT_CLASSES: ClassVar[set[str]] = {
        f"waterfall--{name}" for name in ("level", "order", "band-name", "axis", "cursor", "note")
    }
    DEFAULT_CSS = """
    WaterfallDrawing {
        height: 1fr; min-height: 4;
        & > .waterfall--level { color: $foreground; }
        & > .waterfall--order { color: $text-error; }
        & > .waterfall--band-name { color: $text-error; }
        & > .waterfall--axis { color: $text-muted; }
        & > .waterfall--cursor { color: $text-warning; text-style: bold; }
        & > .waterfall--note { color: $text-muted; }
    }
    """

    def __init__(self) -> None:
        super().__init__(id="waterfall-drawing")
        self.data: WaterfallData | None = None
        self.depth_db = 40.0
        self.at: tuple[int, float] | None = None
        self.sentence = "Reading the recording ..."

    def draw(self, canvas: Canvas) -> None:
        """The levels, or what is missing."""
        if self.data is None:
            write_empty(canvas, self.sentence)
        else:
            draw_waterfall(canvas, self.data, self.depth_db, self.at)


class WaterfallScreen(ModalScreen[None]):
    """One recording: levels over frequency and time, and the strongest line at the cursor."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape,q", "dismiss", "Close", priority=True, id="waterfall.close"),
        Binding("up", "move(-1)", "Earlier", id="waterfall.up"),
        Binding("down", "move(1)", "Later", id="waterfall.down"),
        Binding("shift+up", f"move({-FAR})", "Earlier", show=False, id="waterfall.far-up"),
        Binding("shift+down", f"move({FAR})", "Later", show=False, id="waterfall.far-down"),
        Binding("Y", "app.copy_view", "As text", show=False, id="waterfall.text"),
        Binding("home", "strongest", "Strongest", id="waterfall.home",
                tooltip="To the time when a line is strongest"),
        Binding("plus,equals_sign", "depth(1)", "Deeper", id="waterfall.deeper"),
        Binding("minus", "depth(-1)", "Less deep", id="waterfall.flatter"),
    ]  # fmt: skip

    def __init__(self, entry: RecordingEntry, orders: tuple[Band, ...], up_to_hz: float) -> None:
        super().__init__()
        self.entry, self.orders, self.up_to_hz = entry, orders, up_to_hz
        self.found: Waterfall | None = None
        self.at = 0
        self.depth = DEPTHS_DB.index(40.0)

    def compose(self) -> ComposeResult:
        """Title, picture, words, keys."""
        title = f"{self.entry.path.name}: frequency across, time downward"
        with Vertical(classes="window curve-window"):
            yield Static(safe(title), markup=False, classes="window-title")
            yield WaterfallDrawing()
            yield Static("", markup=False, id="waterfall-at")
            yield Static("", markup=False, id="waterfall-reading")
            yield Static(KEYS, markup=False, classes="hint")

    def on_mount(self) -> None:
        """Read the recording in a thread."""
        self.read()

    @work(thread=True, exclusive=True, exit_on_error=False, group="waterfall")
    def read(self) -> None:
        """The recording in blocks, told how far."""
        from fieldkit.workup.waterfall import waterfall_of

        worker = get_current_worker()
        progress = Progress(self._say, lambda: worker.is_cancelled)
        try:
            found = waterfall_of(self.entry, self.up_to_hz, progress)
        except Cancelled:
            return
        except FieldkitError as error:
            self._tell(self.wait, sentence(str(error)))
            return
        if not worker.is_cancelled:
            self._tell(self.take, found)

    def _tell(self, what: object, *words: object) -> None:
        if self.is_attached:
            self.app.call_from_thread(what, *words)  # type: ignore[arg-type]

    def _say(self, _doing: str, share: float) -> None:
        self._tell(self.wait, f"Reading the recording ... {100 * share:.0f} %")

    def wait(self, words: str) -> None:
        """Say why there is no picture yet."""
        drawing = self.query_one(WaterfallDrawing)
        drawing.sentence = safe(words)
        drawing.redraw()

    def take(self, found: Waterfall) -> None:
        """Show it, the cursor where a line is strongest."""
        self.found = found
        self.query_one(WaterfallDrawing).data = waterfall_data(found, self.orders)
        self.query_one("#waterfall-reading", Static).update(safe(reading(found, self.orders)))
        self.action_strongest()

    def action_strongest(self) -> None:
        """To the time when a line is strongest."""
        if self.found is not None:
            self.at = int(self.found.strongest_rms.argmax())
            self._read()

    def action_move(self, steps: int) -> None:
        """To another time."""
        if self.found is not None:
            self.at = min(max(self.at + steps, 0), len(self.found.time_s) - 1)
            self._read()

    def action_depth(self, step: int) -> None:
        """Show weaker or only stronger levels."""
        self.depth = min(max(self.depth + step, 0), len(DEPTHS_DB) - 1)
        self._read()

    def on_click(self, event: events.Click) -> None:
        """The cursor to the time under the pointer."""
        drawing = self.query_one(WaterfallDrawing)
        if self.found is None or drawing.data is None or event.widget is not drawing:
            return
        offset = event.get_content_offset(drawing)
        if offset is None:
            return
        frame = waterfall_frame(drawing.data, drawing.size.width, drawing.size.height)
        if frame.top <= offset.y < frame.bottom:
            first = rows_of_times(len(self.found.time_s), frame.rows)
            self.at = min(int(first[offset.y - frame.top]), len(self.found.time_s) - 1)
            self._read()

    def as_text(self) -> list[str]:
        """Everything on the screen in words."""
        if self.found is None:
            return [self.query_one(WaterfallDrawing).sentence]
        return lines(self.entry.path.name, self.found, self.orders)

    def _read(self) -> None:
        found, drawing = self.found, self.query_one(WaterfallDrawing)
        if found is None:
            return
        drawing.depth_db = DEPTHS_DB[self.depth]
        drawing.at = (self.at, float(found.strongest_hz[self.at]))
        drawing.redraw()
        words = f"{at_words(found, self.at, self.orders)}; {DEPTHS_DB[self.depth]:.0f} dB deep"
        self.query_one("#waterfall-at", Static).update(safe(words))


def waterfall_data(found: Waterfall, orders: tuple[Band, ...]) -> WaterfallData:
    """A waterfall as it is drawn."""
    return WaterfallData(
        tuple(time_text(float(t)) for t in found.time_s),
        found.frequency_hz,
        found.rms,
        tuple(
            BandShade(band.low_hz, band.high_hz, band.low_hz, band.high_hz, safe(band.name))
            for band in orders
        ),
    )
