"""The curves of a change over the Detune view: what happens if it is moved, stiffer, heavier."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, ClassVar

from textual import work
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical
from textual.screen import ModalScreen
from textual.widgets import Static
from textual.worker import get_current_worker

from fieldkit.errors import Cancelled, FieldkitError
from fieldkit.progress import Progress
from fieldkit.sheet.curves import (
    headline,
    kept_text,
    lines,
    modes_text,
    read_out,
    shade,
    size_text,
)
from fieldkit.ui.widgets.band_art import BandShade
from fieldkit.ui.widgets.curve_plot import CurveData, CurvePlot
from fieldkit.ui.words import safe, sentence

if TYPE_CHECKING:
    from fieldkit.detune.candidates import Search
    from fieldkit.detune.curves import FixCurve
    from fieldkit.detune.matched import Match
    from fieldkit.detune.verdict import Verdict
    from fieldkit.job.document import Job

KEYS = "←→ move · home drawn · p place k stiffness m mass · enter take · esc close"
FAR = 6
TICKS = 6


class CurveScreen(ModalScreen["Verdict | None"]):
    """One change, one size of it moved by keys; what it comes to is read off at once."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape,q", "dismiss", "Close", priority=True, id="curve.close",
                tooltip="Back, with nothing changed"),
        Binding("left", "move(-1)", "Less", id="curve.less", tooltip="The next smaller value"),
        Binding("right", "move(1)", "More", id="curve.more", tooltip="The next larger value"),
        Binding("shift+left", f"move({-FAR})", "Less", show=False, id="curve.far-less"),
        Binding("shift+right", f"move({FAR})", "More", show=False, id="curve.far-more"),
        Binding("Y", "app.copy_view", "As text", show=False, id="curve.text"),
        Binding("home", "drawn", "Drawn", id="curve.drawn", tooltip="Back to the drawn value"),
        Binding("p", "kind('place')", "Place", id="curve.place"),
        Binding("k", "kind('stiffness')", "Stiffness", id="curve.stiffness"),
        Binding("m", "kind('mass')", "Mass", id="curve.mass"),
        Binding("enter,a", "take", "Take", id="curve.take",
                tooltip="Write the change with this value into the job, after asking"),
    ]  # fmt: skip

    def __init__(self, job: Job, matched: Match | None, fix: Verdict) -> None:
        super().__init__()
        self.job, self.matched, self.fix = job, matched, fix
        self.kind = ""
        self.at = 0
        self.search: Search | None = None
        self.judged: dict[str, FixCurve] = {}
        """Curves worked out so far, by kind."""
        self.drawn: CurveData | None = None
        """The one on screen, ready to draw."""

    @property
    def found(self) -> FixCurve | None:
        """The curve on screen."""
        return self.judged.get(self.kind)

    def compose(self) -> ComposeResult:
        """Title, plot, read-out, keys."""
        with Vertical(classes="window curve-window"):
            yield Static("", markup=False, id="curve-title", classes="window-title")
            yield CurvePlot(id="curve-plot")
            yield Static("", markup=False, id="curve-words")
            yield Static("", markup=False, id="curve-modes")
            yield Static("", markup=False, id="curve-kept")
            yield Static(KEYS, markup=False, classes="hint")

    def on_mount(self) -> None:
        """The first size that the change has."""
        self._title(sentence(self.fix.summary))
        self.query_one(CurvePlot).wait("Judging every value ...")
        self.judge("")

    def action_kind(self, kind: str) -> None:
        """Another size of the change."""
        if kind in self.judged:
            self.kind = kind
            self._start()
            return
        self.query_one("#curve-words", Static).update("Judging every value ...")
        self.judge(kind)

    @work(thread=True, exclusive=True, exit_on_error=False, group="curve")
    def judge(self, kind: str) -> None:
        """Judge the change at every value of a size, of its first one where none is named."""
        from fieldkit.detune.curves import curves_of
        from fieldkit.workup.curves import curve_of, curve_search

        worker = get_current_worker()
        progress = Progress(self._say, lambda: worker.is_cancelled)
        try:
            search = self.search or curve_search(self.job, self.matched)
            wanted = kind or next(iter(curves_of(search, self.fix.change)), "place")
            found = curve_of(self.job, search, self.fix.change, wanted, progress)
        except Cancelled:
            return
        except FieldkitError as error:
            self._tell(self.refuse, str(error))
            return
        if not worker.is_cancelled:
            self._tell(self.take_curve, search, wanted, found)

    def _tell(self, what: object, *words: object) -> None:
        if self.is_attached:
            self.app.call_from_thread(what, *words)  # type: ignore[arg-type]

    def _say(self, _doing: str, share: float) -> None:
        self._tell(self._show_progress, share)

    def _show_progress(self, share: float) -> None:
        words = f"Judging every value ... {100 * share:.0f} %"
        if self.found is None:
            self.query_one(CurvePlot).wait(words)
        else:
            self.query_one("#curve-words", Static).update(words)

    def take_curve(self, search: Search, kind: str, found: FixCurve) -> None:
        """Show a curve, the marker on the drawn value."""
        self.search, self.kind = search, kind
        self.judged[kind] = found
        self._start()

    def _start(self) -> None:
        assert self.found is not None
        self.at = self.found.varied.drawn
        number = f"Change {self.fix.rank}: " if self.fix.rank else ""
        self.drawn = curve_data(self.found, self.job.units)
        kept = kept_text(self.found, self.job.units)
        self.query_one("#curve-kept", Static).update(safe(kept))
        self._title(f"{number}{headline(self.found).lower() if number else headline(self.found)}")
        self._read()

    def refuse(self, reason: str) -> None:
        """Why there is no such curve."""
        if self.found is None:
            self.query_one(CurvePlot).wait(safe(sentence(reason)))
        self.query_one("#curve-words", Static).update(safe(sentence(reason)))

    def action_move(self, steps: int) -> None:
        """The marker to another value."""
        if self.found is not None:
            self.at = min(max(self.at + steps, 0), len(self.found.chance) - 1)
            self._read()

    def action_drawn(self) -> None:
        """The marker back to the drawn value."""
        if self.found is not None:
            self.at = self.found.varied.drawn
            self._read()

    def on_curve_plot_picked(self, message: CurvePlot.Picked) -> None:
        """The pointer moved the marker."""
        self.action_move(message.number - self.at)

    @work(thread=True, exclusive=True, exit_on_error=False, group="curve-take")
    def action_take(self) -> None:
        """Describe the change with the value under the marker in full and hand it over."""
        from fieldkit.detune.rank import judged_change

        found, search, job = self.found, self.search, self.job
        if found is None or search is None:
            return
        if found.kept_out[self.at]:
            self._tell(self.notify, "Kept out here.")
            return
        change = found.varied.changes[self.at]
        verdict = judged_change(search, job.tapped, job.running, change, job.units)
        self._tell(self.dismiss, replace(verdict, rank=0))

    def as_text(self) -> list[str]:
        """Everything on the screen in words."""
        found, units = self.found, self.job.units
        if found is None:
            return [sentence(self.fix.summary)]
        return [
            *lines(found, units),
            "",
            read_out(found, self.at, units),
            modes_text(found, self.at),
        ]

    def _title(self, text: str) -> None:
        self.query_one("#curve-title", Static).update(safe(text))

    def _read(self) -> None:
        found, units = self.found, self.job.units
        assert found is not None
        assert self.drawn is not None
        self.query_one(CurvePlot).show(self.drawn, self.at)
        self.query_one("#curve-words", Static).update(safe(read_out(found, self.at, units)))
        self.query_one("#curve-modes", Static).update(safe(modes_text(found, self.at)))


def curve_data(found: FixCurve, units: str) -> CurveData:
    """A curve as it is drawn."""
    own = found.varied
    log = own.kind == "stiffness"
    shown = CurveData(
        own.value,
        log,
        found.frequency_hz,
        tuple("╱" if out else shade(found, i) for i, out in enumerate(found.kept_out)),
        tuple(
            BandShade(b.low_hz, b.high_hz, b.avoid_low_hz, b.avoid_high_hz, safe(b.name))
            for b in found.bands
        ),
        own.drawn,
        found.up_to_hz,
        (),
    )
    ticks = tuple((float(x), size_text(own.kind, float(x), units)) for x in shown.axis.ticks(TICKS))
    return replace(shown, ticks=ticks)
