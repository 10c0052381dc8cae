"""The guided tap test: large words, level, live spectrum, the latest decay, blows and modes."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, ClassVar

import numpy as np
from textual import work
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical
from textual.widgets import Footer

from fieldkit.errors import FieldkitError
from fieldkit.ui.capture import tap_words as words
from fieldkit.ui.capture.channel_forms import place_form, placed
from fieldkit.ui.capture.level_meter import MOST_METERS, SHORT_METERS, meters
from fieldkit.ui.capture.live_screen import LEAVING_KEYS, Begin, LiveScreen
from fieldkit.ui.capture.tap_run import FAULTS, TapRun
from fieldkit.ui.dialogs import PickScreen
from fieldkit.ui.forms import FormWindow, Values
from fieldkit.ui.plots import mode_marks, spectrum_curve, unit_of
from fieldkit.ui.units import AMPLITUDES
from fieldkit.ui.views.base import plain
from fieldkit.ui.widgets import BandShade, Curve, SpectrumPlot, TapMark, TimePlot
from fieldkit.ui.words import count

if TYPE_CHECKING:
    from fieldkit.capture.guide import Blow
    from fieldkit.ui.capture.tap_run import TapLook

NO_RIG = "Space strikes the practice rig; here the pipe is real: strike it with the hammer."


class TapScreen(LiveScreen[TapRun]):
    """Blow by blow to modes that can be believed."""

    TITLE = "Guided tap test"
    KEEP = "Stop and keep"
    GO_ON = "Go on tapping"
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("space,enter", "strike", "Tap", key_display="space", id="guided.strike",
                tooltip="Strike the practice rig (enter does too)"),
        Binding("x", "fault", "Faults", id="guided.fault",
                tooltip="Strike the practice rig wrongly, let its machine run, or unplug it"),
        Binding("u", "undo", "Undo blow", id="guided.undo",
                tooltip="Set the latest blow aside that counts; it stays in the recording, marked"),
        Binding("U", "redo", "Take in again", show=False, id="guided.redo",
                tooltip="Take the latest blow in again that was set aside"),
        Binding("d", "next", "Next place", id="guided.next",
                tooltip="Next direction or place, in a recording of its own"),
        Binding("b", "listen", "Background", show=False, id="guided.listen",
                tooltip="Measure the background again"),
        Binding("v", "other_plot", "Plot", id="guided.plot",
                tooltip="Spectrum of the latest blow instead of its decay, or back"),
        Binding("s", "keep", "Keep", id="guided.keep",
                tooltip="Stop, and add what was recorded to the job"),
        *LEAVING_KEYS,
    ]  # fmt: skip

    def __init__(
        self, begin: Begin[TapRun], job_title: str, units: str, bands: Sequence[BandShade] = ()
    ) -> None:
        super().__init__(begin)
        self.job_title = job_title
        self.units = units
        self.bands = tuple(bands)
        self._picture = (0, 0)
        self._blow = 0
        self._verdict_frame = self._news_frame = 0
        self._news = ""

    def compose(self) -> ComposeResult:
        """From what is read across the room to what is read up close."""
        yield plain("live-title", classes="live-title")
        with Horizontal(id="banner"):
            yield plain("big")
            yield plain("side")
        yield plain("now", classes="live-now")
        yield plain("told")
        yield plain("meters")
        yield SpectrumPlot(id="live-spectrum", empty="Listening ...")
        with Horizontal(id="live-lower"):
            with Vertical(id="live-blow"):
                yield TimePlot(id="live-decay", empty="The decay of each blow comes here")
                yield SpectrumPlot(id="live-after", empty="The spectrum of each blow comes here")
            yield plain("live-blows")
            yield plain("live-modes")
        yield Footer(compact=True, show_command_palette=False)

    def on_mount(self) -> None:
        """The plot takes the keys that the screen does not; the base's handler runs as well."""
        self.query_one("#live-spectrum").focus()

    def poll(self) -> None:
        """Everything from one look."""
        if self.adding is not None:
            self.say_big("saving", words.CALM)
            return
        if self.run is None:
            self._say_not_begun()
            return
        look = self.run.look()
        self._say_words(look)
        self._say_levels(look)
        self._draw_live(look)
        self._draw_blow(look)

    def _say_not_begun(self) -> None:
        self.say("#live-title", self.title_line(f"{self.TITLE}  {self.job_title}", False))
        self.say_big("not now" if self.refused else "one moment",
                     words.BAD if self.refused else words.CALM)  # fmt: skip
        self.say("#now", self.refused or "Getting the input ready.")
        self.say("#told", "esc goes back to the set-up." if self.refused else "")

    def _say_words(self, look: TapLook) -> None:
        number = look.guide.latest.number if look.guide.latest else 0
        if number != self._blow:
            self._verdict_frame = look.session.frames
        age_s = (look.session.frames - self._verdict_frame) / look.session.rate_hz
        large, below, tone = words.headline(look, age_s if number else np.inf)
        title = f"{self.TITLE}  {self.job_title}"
        self.say("#live-title", self.title_line(title, look.session.simulated))
        self.say_big(large, tone)
        self.say("#side", "\n".join(words.side_lines(look)))
        self.say("#now", below)
        if look.session.message != self._news:
            self._news, self._news_frame = look.session.message, look.session.frames
        news_age_s = (look.session.frames - self._news_frame) / look.session.rate_hz
        self.say("#told", "\n".join(words.told(look, news_age_s)))
        rows = self.query_one("#live-lower").size.height
        self.say("#live-blows", "\n".join(words.blow_lines(look.guide, rows)))
        self.say("#live-modes", "\n".join(words.mode_lines(look.guide, rows)))

    def _say_levels(self, look: TapLook) -> None:
        sizes = [threshold.size for threshold in look.guide.thresholds]
        passed = dict(zip([ear.channel for ear in look.guide.ears], sizes, strict=False))
        rows = SHORT_METERS if self.has_class("-short") else MOST_METERS
        labels = words.meter_labels(look, short=len(look.session.levels) > rows)
        width = self.size.width - 2
        self.say("#meters", meters(look.session.levels, labels, width, passed, rows=rows))

    def _draw_live(self, look: TapLook) -> None:
        picture = look.picture
        if picture is None or (look.heard, picture.number) == self._picture:
            return
        self._picture = (look.heard, picture.number)
        factor, unit = AMPLITUDES.get(picture.unit, (1.0, picture.unit))
        estimate = look.guide.estimate
        self.query_one("#live-spectrum", SpectrumPlot).show(
            (Curve(picture.frequency_hz, factor * picture.now, words.heard(look)),),
            mode_marks(estimate.modes) if estimate else (),
            self.bands,
            amplitude_unit=f"{unit} rms",
            up_to_hz=float(picture.frequency_hz[-1]),
        )

    def _draw_blow(self, look: TapLook) -> None:
        latest = look.guide.latest
        if latest is None or latest.number == self._blow:
            return
        self._blow = latest.number
        self._draw_decay(latest)
        spectrum = latest.reading.spectrum if latest.reading else None
        self.query_one("#live-after", SpectrumPlot).show(
            (spectrum_curve(spectrum, f"blow {latest.number}"),) if spectrum else (),
            amplitude_unit=unit_of(spectrum),
            up_to_hz=float(spectrum.frequency_hz[-1]) if spectrum else 1.0,
        )

    def _draw_decay(self, blow: Blow) -> None:
        plot = self.query_one("#live-decay", TimePlot)
        if blow.reading is None:
            plot.show((), 1.0)
            return
        trace = blow.reading.trace
        both = np.stack([trace.low, trace.high], axis=1).ravel()
        mark = TapMark(blow.number, max(-trace.start_s, 0.0), blow.verdict.usable,
                       "" if blow.verdict.usable else blow.verdict.kind)  # fmt: skip
        plot.show(both, 2 / trace.step_s, (mark,))

    def action_strike(self) -> None:
        """One blow on the practice rig."""
        if self.run is not None and not self.run.strike():
            self.notify(NO_RIG, markup=False)

    @work
    async def action_fault(self) -> None:
        """What can go wrong, to see what is said about it."""
        if self.run is None or not self.run.practice:
            self.notify(NO_RIG, markup=False)
            return
        picked = await self.app.push_screen_wait(PickScreen("Practise a fault", FAULTS))
        if picked is not None:
            try:
                self.run.strike(picked)
            except FieldkitError as error:
                self.notify(str(error), severity="error", markup=False)

    def action_undo(self) -> None:
        """The latest blow that counts no longer does."""
        if self.run is None:
            return
        number = self.run.undo()
        if number is None:
            self.notify("No blow counts yet: there is nothing to set aside.", markup=False)
        else:
            self.notify(f"Blow {number} is set aside; U takes it in again.", markup=False)

    def action_redo(self) -> None:
        """And does again."""
        if self.run is None:
            return
        number = self.run.redo()
        said = "No blow was set aside." if number is None else f"Blow {number} counts again."
        self.notify(said, markup=False)

    def action_listen(self) -> None:
        """Measure the background again."""
        if self.run is not None:
            self.run.listen_anew()

    @work
    async def action_next(self) -> None:
        """Next direction or place; while it is typed the sensor may be moved."""
        run = self.run
        if run is None or self.adding is not None:
            return
        run.hands_on()
        before = run.channels
        form, texts = place_form(before)
        title = "Move sensor and hammer, then enter: nothing is recorded meanwhile"

        def objection(values: Values) -> str:
            try:
                placed(before, texts | values)
            except FieldkitError as error:
                return str(error)
            return ""

        values = await self.app.push_screen_wait(
            FormWindow(form, title, texts, self.units, objection)
        )
        if values is not None:
            moved = placed(before, texts | values)
            if moved != before:
                run.move_to(moved)
        run.hands_off()

    def action_other_plot(self) -> None:
        """Decay or spectrum of the latest blow."""
        self.toggle_class("-after")

    def action_keep(self) -> None:
        """Stop, and let the job have it."""
        if self._good == 0:
            self.notify("No blow counts yet: there is nothing to keep; esc leaves.", markup=False)
            return
        self.end(add=True)

    def unsaved(self) -> str:
        """What leaving would keep from the job."""
        return count(self._good, "usable blow") if self._good else ""

    @property
    def _good(self) -> int:
        """Blows that count, anywhere."""
        return sum(blow.counts for blow in self.run.look().guide.blows) if self.run else 0
