"""The curves of a change on screen, with a marker that keys and mouse move."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from textual import events
from textual.message import Message

from fieldkit.ui.widgets.curve_art import CurveData, curve_frame, draw_curves
from fieldkit.ui.widgets.drawing import Drawing, write_empty
from fieldkit.ui.widgets.raster import Canvas

__all__ = ["CurveData", "CurvePlot"]


class CurvePlot(Drawing):
    """Modes against one size of a change."""

    COMPONENT_PREFIX = "curve"
    COMPONENT_CLASSES: ClassVar[set[str]] = {
        f"curve--{name}"
        for name in (
            "mode", "doubt", "band", "margin", "band-name", "cursor", "drawn", "chance",
            "axis", "note",
        )
    }  # fmt: skip
    DEFAULT_CSS = """
    CurvePlot {
        height: 1fr; min-height: 5;
        & > .curve--mode { color: $foreground; text-style: bold; }
        & > .curve--doubt { color: $text-accent; }
        & > .curve--band { color: $error; background: $error 25%; }
        & > .curve--margin { color: $error 40%; background: $error 10%; }
        & > .curve--band-name { color: $text-error; }
        & > .curve--cursor { color: $text-warning; text-style: bold; }
        & > .curve--drawn { color: $text-success; }
        & > .curve--chance { color: $text-success; }
        & > .curve--axis { color: $text-muted; }
        & > .curve--note { color: $text-muted; }
    }
    """

    @dataclass
    class Picked(Message):
        """The pointer asks for a value."""

        number: int

    def __init__(self, *, id: str | None = None) -> None:
        super().__init__(id=id)
        self.data: CurveData | None = None
        self.at = 0
        self.sentence = ""

    def show(self, data: CurveData, at: int) -> None:
        """Draw these curves with the marker on the nth value."""
        self.data, self.at = data, at
        self.redraw()

    def wait(self, sentence: str) -> None:
        """Say why there is nothing to see yet."""
        self.data, self.sentence = None, sentence
        self.redraw()

    def draw(self, canvas: Canvas) -> None:
        """The curves, or what is missing."""
        if self.data is None:
            write_empty(canvas, self.sentence)
        else:
            draw_curves(canvas, self.data, self.at)

    def on_click(self, event: events.Click) -> None:
        """The marker goes to the nearest value."""
        offset = event.get_content_offset(self)
        if self.data is None or offset is None:
            return
        frame = curve_frame(self.data, self.size.width, self.size.height)
        value = frame.value_at(offset.x)
        if value is not None:
            apart = np.abs(frame.axis.share(self.data.value) - frame.axis.share(value))
            self.post_message(self.Picked(int(np.argmin(apart))))

    def on_mouse_scroll_up(self, event: events.MouseScrollUp) -> None:
        """The marker one value on."""
        self._step(event, 1)

    def on_mouse_scroll_down(self, event: events.MouseScrollDown) -> None:
        """The marker one value back."""
        self._step(event, -1)

    def _step(self, event: events.MouseEvent, step: int) -> None:
        event.stop()
        if self.data is not None:
            last = len(self.data.value) - 1
            self.post_message(self.Picked(min(last, max(0, self.at + step))))
