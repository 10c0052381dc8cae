"""Tap: recordings and their blows, the averaged spectrum, the measured modes."""

from __future__ import annotations

from typing import TYPE_CHECKING, ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Container, Horizontal
from textual.widgets import DataTable

from fieldkit.ui.dialogs import TextScreen
from fieldkit.ui.messages import AddWanted, EditWanted, RemoveWanted, TraceWanted
from fieldkit.ui.plots import (
    blow_marks,
    decay_lines,
    mode_cells,
    overlaid,
    shaded,
    spectrum_curve,
    tap_marks,
    unit_of,
)
from fieldkit.ui.table import Row, Table
from fieldkit.ui.views.base import View, plain
from fieldkit.ui.widgets import Curve, SpectrumPlot, TimePlot
from fieldkit.ui.words import seconds, sentence

if TYPE_CHECKING:
    from fieldkit.signal.modes import MeasuredMode
    from fieldkit.signal.taps import Tap
    from fieldkit.workup import TapReading


BEFORE_BLOW = 0.08
"""Of the time a blow rings: what is shown before it."""
NEAR_S = 0.1
"""From a blow to somewhere in its decay."""
NO_TAP = (
    "No tap recording yet: press m to tap now (a practice rig is built in), a to name a recording, "
    "or p to type in a peak read elsewhere"
)
CAUTION_LINE = "! Ask the operator first; no hot or pressurised line without a permit (c)"
CAUTION = """\
Before you strike a pipe

· Ask the operator, follow the permit and the rules of the site. Local codes and licensed
  practice come before anything on this screen.
· Best with the machine stopped, the line cold, empty or at rest, and locked out.
· Do not strike a hot or pressurised line, small-bore branches, gauges, sight glasses, cast
  iron, lined or cracked pipe, or anything that is leaking or thinned, without written leave.
· Soft hammer only (rubber, plastic, a shoe on the fist): a tap, not a blow. It must leave no
  mark and strike no spark; in a classified area use only what the area allows.
· Eyes, hands, ears: glasses and gloves; keep fingers and cables away from couplings, fans and
  hot surfaces. Tie sensor, cable and laptop down. Nobody stands under the pipe.
· Fatigue needs no warning: if you see a crack, a leak or a loose support, stop and report it.

A good tap
· Four to eight blows, well apart, each rung out before the next; sensor near mid-span, never on
  a support. Vertical and lateral each in a recording of their own.
(common practice, no source)
"""


class TapView(View):
    """Plots above, measured modes and recordings below."""

    NAME = "tap"
    HOME = "#modes"
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("m", "app.measure('tap')", "Measure", id="tap.measure",
                tooltip="Guided tap test with an input or the practice rig"),
        Binding("a", "add", "Add", id="tap.add", tooltip="Name a tap recording"),
        Binding("p", "peak", "Peak", id="tap.peak",
                tooltip="Type in a peak that was read elsewhere"),
        Binding("e", "edit", "Edit", id="tap.edit",
                tooltip="Change the recording under the cursor"),
        Binding("d,delete", "remove", "Remove", show=False, id="tap.remove",
                tooltip="Take the recording under the cursor out of the job"),
        Binding("v", "other_plot", "Plot", id="tap.plot",
                tooltip="Show the signal instead of the spectrum, or back"),
        Binding("w", "overlay", "With others", show=False, id="tap.overlay",
                tooltip="All tap recordings over each other, told apart by letter"),
        Binding("x", "refused", "Refused", id="tap.refused",
                tooltip="Tones, and the peaks and blows that were not accepted, with reasons"),
        Binding("h", "response", "Hammer", show=False, id="tap.response",
                tooltip="Frequency response and coherence, where the hammer is on record"),
        Binding("c", "caution", "Caution", id="tap.caution", tooltip="Before you strike a pipe"),
    ]  # fmt: skip

    def __init__(self) -> None:
        super().__init__()
        self.overlay = False
        """Whether all recordings are drawn over each other."""
        self._looked_at = ""

    def compose(self) -> ComposeResult:
        """Caution, two plots, two tables."""
        yield plain("tap-caution", classes="caution")
        with Container(id="tap-plots"):
            yield SpectrumPlot(id="tap-spectrum", classes="plot")
            yield TimePlot(id="tap-time", classes="plot")
        with Horizontal(classes="lower"):
            yield Table("mode Hz", "damping %", "direction", "taps", id="modes")
            yield Table("blow at", "judged", id="blows")

    def on_mount(self) -> None:
        """The caution never changes."""
        super().on_mount()
        self.write("#tap-caution", CAUTION_LINE)

    def draw(self) -> None:
        """Tables first: the cursor in them says what the plots show."""
        found = self.desk.workup
        self.table("#modes").fill(_mode_rows(found.evidence.firm) if found else [])
        self.table("#blows").fill(_blow_rows(found.taps, found.simulated) if found else [])
        self._draw_plots()

    @property
    def reading(self) -> TapReading | None:
        """The recording under the cursor."""
        found = self.desk.workup.taps if self.desk.workup else ()
        key = self.table("#blows").chosen or "0"
        number = int(key.partition(".")[0])
        return found[number] if number < len(found) else None

    @property
    def _missing(self) -> str:
        """What stands where there is no curve."""
        if self.desk.awaits("tap") and self.desk.has("tap"):
            return "Reading the taps ..."
        return " ".join(map(sentence, self.desk.refusals("tap"))) or NO_TAP

    def _draw_plots(self) -> None:
        found = self.reading
        spectrum = found.spectrum if found else None
        plot = self.query_one(SpectrumPlot)
        plot.empty_sentence = self._missing
        plot.show(
            self._curves(found),
            tap_marks(self.desk),
            shaded(self.desk),
            amplitude_unit=unit_of(spectrum),
            up_to_hz=self.desk.up_to_hz,
        )
        self._draw_trace(found)

    def _curves(self, found: TapReading | None) -> tuple[Curve, ...]:
        """The recording under the cursor, or all that can be compared with it."""
        spectrum = found.spectrum if found else None
        if found is None or spectrum is None:
            return ()
        if not self.overlay or self.desk.workup is None:
            return (spectrum_curve(spectrum, found.file),)
        every = [
            (one.spectrum, one.file)
            for one in self.desk.workup.taps
            if one.spectrum is not None and one.spectrum.unit == spectrum.unit
        ]
        return overlaid(every)

    def _draw_trace(self, found: TapReading | None) -> None:
        plot = self.query_one(TimePlot)
        plot.empty_sentence = self._missing
        signal = self.desk.traces.get(found.entry) if found else None
        if found is None or signal is None:
            plot.show((), 1.0)
        else:
            plot.show(
                signal,
                len(signal) / found.duration_s or 1.0,
                blow_marks(found),
                decays=decay_lines(found, signal, self.desk.workup.evidence.firm)
                if self.desk.workup
                else (),
            )
            self._look_at_blow(found)
        if found is not None and signal is None:
            self.post_message(TraceWanted(found.entry))

    def _look_at_blow(self, found: TapReading) -> None:
        """The blow under the cursor fills the plot; on the recording's own row the whole does."""
        plot, key = self.query_one(TimePlot), self.table("#blows").chosen or ""
        if key == self._looked_at:
            return
        self._looked_at = key
        number = int(key.partition(".")[2] or -1)
        if not 0 <= number < len(found.search.taps):
            plot.action_home()
            return
        blow = found.search.taps[number]
        ringing = [d.end_s for d in plot.trace.decays if d.start_s <= blow.at_s + NEAR_S <= d.end_s]
        end_s = min([*ringing, blow.end / found.rate_hz])
        plot.look_at(blow.at_s - BEFORE_BLOW * (end_s - blow.at_s), end_s)

    def on_data_table_row_highlighted(self, event: DataTable.RowHighlighted) -> None:
        """Another recording or blow is under the cursor."""
        if event.data_table.id == "blows":
            self._draw_plots()

    def on_data_table_row_selected(self, event: DataTable.RowSelected) -> None:
        """Enter on a recording edits it."""
        if event.data_table.id == "blows":
            self.action_edit()

    def action_add(self) -> None:
        """Name a tap recording."""
        self.post_message(AddWanted("recording", {"kind": "tap"}))

    def action_peak(self) -> None:
        """Type a measured peak in."""
        self.post_message(AddWanted("measured", {}))

    def action_edit(self) -> None:
        """Change what the job says of the recording under the cursor."""
        if (index := self._index()) is not None:
            self.post_message(EditWanted("recording", index))

    def action_remove(self) -> None:
        """Take the recording under the cursor out of the job."""
        if (index := self._index()) is not None:
            self.post_message(RemoveWanted("recording", index))

    def _index(self) -> int | None:
        entry = self.reading.entry if self.reading else None
        if entry is None or self.desk.job is None or entry not in self.desk.job.recordings:
            return None
        return self.desk.job.recordings.index(entry)

    def action_overlay(self) -> None:
        """All recordings over each other, or one."""
        self.overlay = not self.overlay
        self._draw_plots()

    def action_other_plot(self) -> None:
        """On a small screen one plot at a time is shown."""
        self.toggle_class("-time")

    def action_refused(self) -> None:
        """What was looked at and not accepted."""
        self.app.push_screen(TextScreen("Not accepted as modes", "\n".join(self._refused())))

    def action_response(self) -> None:
        """The frequency response of the recording under the cursor, or what it lacks."""
        from fieldkit.ui.response_screen import response_window

        self.app.push_screen(response_window(self.desk, self.reading))

    def action_caution(self) -> None:
        """The cautions in full."""
        self.app.push_screen(TextScreen("Caution", CAUTION))

    def _refused(self) -> list[str]:
        found = self.desk.workup
        if found is None:
            return ["Nothing has been read yet."]
        evidence = found.evidence
        lines = [f"{p.frequency_hz:8.2f} Hz  {sentence(p.reason)}" for p in evidence.refused]
        tones = [f"{t.frequency_hz:8.2f} Hz  A steady tone, not a mode." for t in evidence.tones]
        blows = [
            f"{blow.at_s:8.2f} s   {reading.file}: {sentence('; '.join(blow.reasons))}"
            for reading in found.taps
            for blow in reading.search.taps
            if not blow.usable
        ]
        words = [sentence(text) for text in (*self.desk.refusals("tap"), *evidence.warnings)]
        blocks = [block for block in (lines, tones, blows, words) if block]
        return ["\n".join(block) + "\n" for block in blocks] or ["Everything was accepted."]


def _mode_rows(modes: tuple[MeasuredMode, ...]) -> list[Row]:
    return [(str(number), _mode_cells(mode)) for number, mode in enumerate(modes)]


def _mode_cells(mode: MeasuredMode) -> tuple[str, ...]:
    return (
        *mode_cells(mode),
        mode.direction or "not said",
        str(mode.taps) if mode.taps else "typed",
    )


def _blow_rows(readings: tuple[TapReading, ...], simulated: tuple[str, ...]) -> list[Row]:
    rows: list[Row] = []
    for number, reading in enumerate(readings):
        blows = reading.search.taps
        usable = f"{sum(blow.usable for blow in blows)} of {len(blows)} usable"
        struck = ", h response" if reading.hammer else ""
        origin = "simulated, " if reading.file in simulated else ""
        length = seconds(reading.duration_s)
        rows.append((str(number), (reading.file, f"{origin}{usable}{struck}, {length}")))
        rows += [
            (f"{number}.{i}", (f"{blow.at_s:9.2f} s", _judged(blow)))
            for i, blow in enumerate(reading.search.taps)
        ]
    return rows


def _judged(blow: Tap) -> str:
    return "✓ usable" if blow.usable else f"✗ {'; '.join(blow.reasons)}"
