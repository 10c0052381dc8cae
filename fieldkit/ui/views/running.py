"""Running: which lines shake the pipe, on which order of which machine, and which modes answer."""

from __future__ import annotations

from typing import TYPE_CHECKING, ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal
from textual.widgets import DataTable

from fieldkit.detune.excitation import excitation_band
from fieldkit.ui.diagnosis_words import details, in_short, times
from fieldkit.ui.dialogs import TextScreen
from fieldkit.ui.messages import AddWanted, EditWanted
from fieldkit.ui.plots import (
    mode_cells,
    overlaid,
    running_marks,
    shaded,
    spectrum_curve,
    unit_of,
)
from fieldkit.ui.readings import nearest_mode
from fieldkit.ui.table import Row, Table
from fieldkit.ui.units import level
from fieldkit.ui.views.base import View, plain
from fieldkit.ui.widgets import Curve, SpectrumPlot
from fieldkit.ui.words import DASH, hertz, ratio_percent, seconds, sentence

if TYPE_CHECKING:
    from fieldkit.signal.modes import MeasuredMode
    from fieldkit.signal.running import RunningPicture
    from fieldkit.workup import RunningReading
    from fieldkit.workup.findings import RunningFindings


NO_RECORDING = "No running recording yet: press m to record one now, a to name one"


class RunningView(View):
    """Spectrum above; levels, lines and the modes seen in them below."""

    NAME = "running"
    HOME = "#lines"
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("m", "app.measure('running')", "Measure", id="running.measure",
                tooltip="Record the running machine with an input or the practice rig"),
        Binding("a", "add", "Add recording", id="running.add", tooltip="Name a running recording"),
        Binding("e", "edit", "Edit", id="running.edit", tooltip="Change the recording on screen"),
        Binding("v", "next", "Next recording", show=False, id="running.next",
                tooltip="Show the next running recording"),
        Binding("h", "waterfall", "Waterfall", id="running.waterfall",
                tooltip="Frequency against time of the recording on screen: does the speed change"),
        Binding("w", "overlay", "With others", show=False, id="running.overlay",
                tooltip="All running recordings over each other, told apart by letter"),
        Binding("x", "refused", "Refused", show=False, id="running.refused",
                tooltip="Peaks that were not accepted as modes, with reasons"),
        Binding("l", "severity", "Level", show=False, id="running.severity",
                tooltip="Resonance or forced for each line, and the level screened, with sources"),
    ]  # fmt: skip

    def __init__(self) -> None:
        super().__init__()
        self.number = 0
        """Which of the running recordings is on screen."""
        self.overlay = False
        """Whether all of them are drawn over each other."""

    def compose(self) -> ComposeResult:
        """Plot, text, table."""
        yield SpectrumPlot(id="running-spectrum", classes="plot")
        yield plain("running-text")
        with Horizontal(classes="lower"):
            yield Table("Hz", "RMS", "order", "verdict", "amplified", "mode", "apart", id="lines")
            yield Table("mode seen, Hz", "damping %", id="seen")

    @property
    def reading(self) -> RunningReading | None:
        """The recording on screen."""
        found = self.desk.workup.running if self.desk.workup else ()
        return found[self.number % len(found)] if found else None

    def draw(self) -> None:
        """Plot, lines and levels of the recording on screen."""
        found = self.reading
        spectrum = found.picture.spectrum if found else None
        plot = self.query_one(SpectrumPlot)
        plot.empty_sentence = self._missing
        plot.show(
            self._curves(found),
            running_marks(found.picture.lines, self._seen, self.desk) if found else (),
            shaded(self.desk),
            amplitude_unit=unit_of(spectrum),
            up_to_hz=self.desk.up_to_hz,
        )
        self.table("#lines").fill(self._rows(found) if found else [])
        seen = self.table("#seen")
        seen.display = bool(self._seen)
        seen.fill([(str(i), mode_cells(mode)) for i, mode in enumerate(self._seen)])
        self.write("#running-text", "\n".join(self._words(found)))

    def _curves(self, found: RunningReading | None) -> tuple[Curve, ...]:
        if found is None:
            return ()
        own = found.picture.spectrum
        if not self.overlay or self.desk.workup is None:
            return (spectrum_curve(own, found.file),)
        every = [(one.picture.spectrum, one.file) for one in self.desk.workup.running]
        return overlaid([(s, file) for s, file in every if s.unit == own.unit])

    def action_overlay(self) -> None:
        """All recordings over each other, or one."""
        self.overlay = not self.overlay
        self.draw()

    @property
    def _seen(self) -> tuple[MeasuredMode, ...]:
        """Natural frequencies found in the recording on screen."""
        estimate = self.reading.modes if self.reading else None
        return estimate.modes if estimate else ()

    @property
    def _missing(self) -> str:
        """What stands where there is no curve."""
        if self.desk.awaits("running") and self.desk.has("running"):
            return "Reading the recording ..."
        return " ".join(map(sentence, self.desk.refusals("running"))) or NO_RECORDING

    def _rows(self, found: RunningReading) -> list[Row]:
        unit = found.picture.spectrum.unit
        own = self._findings
        told = own.diagnoses if own else ()
        rows: list[Row] = []
        for line in found.picture.lines:
            order = excitation_band(line.frequency_hz, self.desk.bands)
            mode_hz = nearest_mode(self.desk, line.frequency_hz)
            apart = DASH if mode_hz is None else ratio_percent(abs(mode_hz / line.frequency_hz - 1))
            verdict = next(
                (one for one in told if one.line.frequency_hz == line.frequency_hz), None
            )
            if verdict is not None and verdict.mode is not None:
                mode_hz, apart = verdict.mode.hz, ratio_percent(verdict.apart or 0.0)
            cells = (
                f"{line.frequency_hz:.2f}",
                level(line.rms, unit),
                order.name if order else "no known order",
                verdict.verdict if verdict else DASH,
                times(verdict) if verdict else DASH,
                DASH if mode_hz is None else f"{hertz(mode_hz)} Hz",
                apart,
            )
            rows.append((f"{line.frequency_hz:.3f}", cells))
        return rows

    def _words(self, found: RunningReading | None) -> list[str]:
        refused = [f"✗ {sentence(text)}" for text in self.desk.refusals("running")]
        if found is None:
            return refused
        picture = found.picture
        others = (
            "" if self._count < 2 else f" ({self.number % self._count + 1} of {self._count}, v)"
        )
        heading = (
            f"{found.file}{others}, {seconds(found.duration_s)}: overall "
            f"{level(picture.overall_rms, picture.spectrum.unit)} RMS"
            f"{self._as_velocity(picture)}, "
            f"{picture.low_hz:g} to {picture.high_hz:g} Hz"
        )
        notes = (*found.notes, *picture.warnings)
        modes = self._modes_in_words(found)
        own = self._findings
        verdict = own.top if own else None
        said = (in_short(verdict) if verdict else "", heading, self._screened(own))
        return [line for line in (*said, *refused, *map(sentence, notes), modes) if line]

    @staticmethod
    def _screened(own: RunningFindings | None) -> str:
        from fieldkit.sheet.findings import screening_summary

        return f"{screening_summary(own)}; sources under l" if own else ""

    @property
    def _findings(self) -> RunningFindings | None:
        """Verdicts and screening of the recording on screen."""
        found = self.desk.workup.findings if self.desk.workup else None
        if found is None or not found.running:
            return None
        return found.running[self.number % len(found.running)]

    def action_waterfall(self) -> None:
        """Frequency against time, in a window."""
        from fieldkit.detune.excitation import bands
        from fieldkit.ui.waterfall_screen import WaterfallScreen

        found, job = self.reading, self.desk.job
        if found is None or job is None:
            self.notify("Nothing has been read yet.", severity="warning")
            return
        orders = bands(job.excitations, 0.0)
        self.app.push_screen(WaterfallScreen(found.entry, orders, self.desk.up_to_hz))

    def action_severity(self) -> None:
        """Every verdict and every screening, with its source."""
        found = self.desk.workup.findings if self.desk.workup else None
        if found is None or not found.running:
            self.notify("Nothing has been read yet.", severity="warning")
            return
        text = details(found, self.desk.units)
        self.app.push_screen(TextScreen("Resonance or forced, and severity", text))

    def _modes_in_words(self, found: RunningReading) -> str:
        """What the second table holds, or why there is none."""
        if not self._seen:
            return f"No mode seen: {sentence(found.no_modes)}" if found.no_modes else ""
        return "Modes seen running are weaker evidence than a tap; what was not accepted: x."

    @staticmethod
    def _as_velocity(picture: RunningPicture) -> str:
        rms = picture.velocity_rms_m_per_s
        return "" if rms is None else f" ({level(rms, 'm/s')} velocity)"

    @property
    def _count(self) -> int:
        return len(self.desk.workup.running) if self.desk.workup else 0

    def action_add(self) -> None:
        """Name a running recording."""
        self.post_message(AddWanted("recording", {"kind": "running"}))

    def action_edit(self) -> None:
        """Change what the job says of the recording on screen."""
        entry = self.reading.entry if self.reading else None
        if entry is not None and self.desk.job is not None:
            self.post_message(EditWanted("recording", self.desk.job.recordings.index(entry)))

    def action_next(self) -> None:
        """Show the next recording."""
        self.number += 1
        self.draw()

    def action_refused(self) -> None:
        """What looked like a mode and is none."""
        self.app.push_screen(TextScreen("Not accepted as modes", "\n".join(self._refused())))

    def _refused(self) -> list[str]:
        found = self.reading
        if found is None or found.modes is None:
            reason = found.no_modes if found else ""
            return [sentence(reason or "Nothing has been read yet")]
        peaks = [f"{p.frequency_hz:8.2f} Hz  {sentence(p.reason)}" for p in found.modes.refused]
        tones = [
            f"{t.frequency_hz:8.2f} Hz  A machine line, not a mode." for t in found.modes.tones
        ]
        words = [sentence(text) for text in found.modes.warnings]
        return [*peaks, *tones, *words] or ["Everything was accepted."]

    def on_data_table_row_selected(self, _event: DataTable.RowSelected) -> None:
        """Enter on a line does what ``e`` does."""
        self.action_edit()
