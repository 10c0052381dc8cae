"""The spectrum on screen: pan, zoom, cursor and read-out by keyboard or mouse."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import ClassVar

from textual.binding import Binding, BindingType
from textual.message import Message
from textual.reactive import reactive

from fieldkit.ui.widgets.axis_plot import AxisPlot
from fieldkit.ui.widgets.band_art import BandShade
from fieldkit.ui.widgets.drawing import write_empty
from fieldkit.ui.widgets.frame import Frame
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.spectrum_art import View, draw_spectrum, plot_frame, read_cursor
from fieldkit.ui.widgets.spectrum_data import Curve, Mark, SpectrumData
from fieldkit.ui.widgets.view_range import Axis

__all__ = ["BandShade", "Curve", "Mark", "SpectrumPlot"]

LIFT = 0.1


class SpectrumPlot(AxisPlot):
    """Amplitude against frequency with marks and shaded bands."""

    COMPONENT_PREFIX = "spectrum"
    COMPONENT_CLASSES: ClassVar[set[str]] = {
        f"spectrum--{name}"
        for name in (
            "measured", "second", "background", "model", "mode", "tone", "refused",
            "axis", "band", "margin", "band-name", "cursor", "readout", "note",
        )
    }  # fmt: skip
    DEFAULT_CSS = """
    SpectrumPlot {
        height: 1fr; min-height: 3;
        & > .spectrum--measured { color: $foreground; }
        & > .spectrum--second { color: $text-secondary; }
        & > .spectrum--background { color: $text-muted; }
        & > .spectrum--model { color: $text-accent; }
        & > .spectrum--mode { color: $text-success; text-style: bold; }
        & > .spectrum--tone { color: $text-primary; }
        & > .spectrum--refused { color: $text-muted; }
        & > .spectrum--axis { color: $text-muted; }
        & > .spectrum--band { color: $error; background: $error 25%; }
        & > .spectrum--margin { color: $error 40%; background: $error 10%; }
        & > .spectrum--band-name { color: $text-error; }
        & > .spectrum--cursor { color: $text-warning; text-style: bold; }
        & > .spectrum--readout { color: $text; }
        & > .spectrum--note { color: $text-muted; }
    }
    """
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("up", "lift(1)", "Up", show=False, id="spectrum.up", tooltip="Larger amplitudes"),
        Binding("down", "lift(-1)", "Down", show=False, id="spectrum.down",
                tooltip="Smaller amplitudes"),
        Binding("l", "amplitude_scale", "Log/linear amplitude", show=False, id="spectrum.amplitude",
                tooltip="Amplitude by decades or evenly"),
        Binding("f", "frequency_scale", "Log/linear frequency", show=False, id="spectrum.frequency",
                tooltip="Frequency by decades or evenly"),
    ]  # fmt: skip

    amplitude_log: reactive[bool] = reactive(True)
    lift: reactive[float] = reactive(0.0)
    """Shift of the amplitude axis, in shares of its length."""

    @dataclass
    class RangeChanged(Message):
        """The stretch in view or one of the scales changed."""

        plot: SpectrumPlot
        low_hz: float
        high_hz: float
        frequency_log: bool
        amplitude_log: bool

        @property
        def control(self) -> SpectrumPlot:
            """The plot it happened on."""
            return self.plot

        def can_replace(self, message: Message) -> bool:
            """Only the newest range matters."""
            return isinstance(message, SpectrumPlot.RangeChanged) and message.plot is self.plot

    @dataclass
    class CursorMoved(Message):
        """The cursor stands elsewhere, or (None) nowhere."""

        plot: SpectrumPlot
        frequency_hz: float | None
        amplitude: float | None

        @property
        def control(self) -> SpectrumPlot:
            """The plot it happened on."""
            return self.plot

        def can_replace(self, message: Message) -> bool:
            """Only the newest place matters."""
            return isinstance(message, SpectrumPlot.CursorMoved) and message.plot is self.plot

    def __init__(
        self,
        *,
        empty: str = "No spectrum yet: it appears once a recording has been read",
        name: str | None = None,
        id: str | None = None,
        classes: str | None = None,
    ) -> None:
        super().__init__(name=name, id=id, classes=classes)
        self.empty_sentence = empty
        self.data = SpectrumData()

    def show(
        self,
        curves: Sequence[Curve],
        marks: Sequence[Mark] = (),
        bands: Sequence[BandShade] = (),
        *,
        amplitude_unit: str = "",
        up_to_hz: float | None = None,
    ) -> None:
        """Draw this; the view stays where it was while the ends of the data stay the same."""
        before = self.limits(), self.home()
        self.data = SpectrumData(
            tuple(curves), tuple(marks), tuple(bands), amplitude_unit, up_to_hz
        )
        if (self.limits(), self.home()) != before:
            self.action_home()
        self.redraw()

    def draw(self, canvas: Canvas) -> None:
        """Spectrum, or what is missing."""
        if self.data.empty:
            write_empty(canvas, self.empty_sentence)
        else:
            draw_spectrum(canvas, self.data, self._view)

    @property
    def _view(self) -> View:
        return View(self.axis, self.amplitude_log, self.lift, self.cursor, self.has_focus)

    def frame(self) -> Frame:
        """Where the plot lies in the content area."""
        return plot_frame(self.data, self._view, self.size.width, self.size.height)

    def limits(self) -> Axis:
        """From zero, or by decades the first line, to the highest frequency there is."""
        return self.data.limits(self.axis.log)

    def home(self) -> Axis:
        """As far up as the question goes."""
        return self.data.home(self.axis.log)

    def marked(self) -> Sequence[float]:
        """Frequencies of the marks."""
        return [mark.frequency_hz for mark in self.data.marks]

    def watch_amplitude_log(self) -> None:
        """Draw on the other scale and tell."""
        self.watch_axis()

    def watch_lift(self) -> None:
        """Draw shifted."""
        self.redraw()

    def axis_changed(self) -> None:
        """Tell what is in view."""
        axis = self.axis
        self.post_message(
            self.RangeChanged(self, axis.low, axis.high, axis.log, self.amplitude_log)
        )

    def cursor_changed(self) -> None:
        """Tell what the cursor reads."""
        reading = read_cursor(self.data, self._view, self.frame())
        self.post_message(self.CursorMoved(self, self.cursor, reading[1] if reading else None))

    def action_home(self) -> None:
        """Back to the first view."""
        super().action_home()
        self.lift = 0.0

    def action_lift(self, direction: int) -> None:
        """Move the amplitude axis."""
        self.lift += direction * LIFT

    def action_amplitude_scale(self) -> None:
        """By decades or evenly."""
        self.lift = 0.0
        self.amplitude_log = not self.amplitude_log

    def action_frequency_scale(self) -> None:
        """By decades or evenly; the ends stay as near as they can."""
        limits = self.data.limits(not self.axis.log)
        low, high = max(limits.low, self.axis.low), self.axis.high
        if self.axis == self.home() or high <= low:
            self.axis = self.data.home(limits.log)
        else:
            self.axis = Axis(low, high, limits.log).kept_within(limits)
