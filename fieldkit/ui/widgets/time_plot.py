"""A whole recording on screen, its taps marked."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from numpy.typing import ArrayLike
from textual.message import Message

from fieldkit.ui.widgets.axis_plot import AxisPlot
from fieldkit.ui.widgets.drawing import write_empty
from fieldkit.ui.widgets.frame import Frame
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.time_art import DecayLine, TapMark, Trace, draw_trace, trace_frame
from fieldkit.ui.widgets.view_range import Axis

__all__ = ["DecayLine", "TapMark", "TimePlot"]


class TimePlot(AxisPlot):
    """Lowest and highest sample per column, with the taps and why some are refused."""

    COMPONENT_PREFIX = "time"
    COMPONENT_CLASSES: ClassVar[set[str]] = {
        f"time--{name}"
        for name in ("signal", "usable", "refused", "axis", "cursor", "readout", "note", "decay")
    }
    DEFAULT_CSS = """
    TimePlot {
        height: 1fr; min-height: 3;
        & > .time--signal { color: $foreground; }
        & > .time--usable { color: $text-success; text-style: bold; }
        & > .time--refused { color: $text-warning; }
        & > .time--axis { color: $text-muted; }
        & > .time--cursor { color: $text-warning; text-style: bold; }
        & > .time--readout { color: $text; }
        & > .time--note { color: $text-muted; }
        & > .time--decay { color: $text-accent; text-style: bold; }
    }
    """

    @dataclass
    class TapChosen(Message):
        """The cursor jumped to a tap."""

        plot: TimePlot
        tap: TapMark

        @property
        def control(self) -> TimePlot:
            """The plot it happened on."""
            return self.plot

    def __init__(
        self,
        *,
        empty: str = "No recording yet: name one to see its taps here",
        name: str | None = None,
        id: str | None = None,
        classes: str | None = None,
    ) -> None:
        super().__init__(name=name, id=id, classes=classes)
        self.empty_sentence = empty
        self.trace = Trace.of(np.empty(0), 1.0)

    def show(
        self,
        samples: ArrayLike,
        rate_hz: float,
        taps: Sequence[TapMark] = (),
        *,
        unit: str = "",
        decays: Sequence[DecayLine] = (),
    ) -> None:
        """Draw one channel (n,) with its taps and envelopes; an empty one says what is missing."""
        before = self.limits()
        values = np.asarray(samples, dtype=float).ravel()
        self.trace = Trace.of(values, rate_hz, tuple(taps), unit, decays)
        if self.limits() != before:
            self.action_home()
            self.cursor = None
        self.redraw()

    def draw(self, canvas: Canvas) -> None:
        """Signal and taps, or what is missing."""
        if len(self.trace.samples) == 0:
            write_empty(canvas, self.empty_sentence)
        else:
            draw_trace(canvas, self.trace, self.axis, self.cursor)

    def look_at(self, start_s: float, end_s: float) -> None:
        """Bring one stretch into view."""
        self.axis = Axis(start_s, end_s).kept_within(self.limits())

    def limits(self) -> Axis:
        """The whole recording."""
        return Axis(0.0, max(self.trace.duration_s, 1e-6))

    def home(self) -> Axis:
        """The whole recording."""
        return self.limits()

    def frame(self) -> Frame:
        """Where the plot lies in the content area."""
        return trace_frame(self.trace, self.axis, self.size.width, self.size.height)

    def marked(self) -> Sequence[float]:
        """When the taps struck."""
        return [tap.at_s for tap in self.trace.taps]

    def cursor_changed(self) -> None:
        """Tell which tap the cursor jumped to."""
        for tap in self.trace.taps:
            if tap.at_s == self.cursor:
                self.post_message(self.TapChosen(self, tap))
