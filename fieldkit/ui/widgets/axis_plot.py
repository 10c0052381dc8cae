"""A drawing with an axis to pan, zoom and read along, by keyboard or mouse."""

from __future__ import annotations

from collections.abc import Sequence
from typing import ClassVar

from textual import events
from textual.binding import Binding, BindingType
from textual.reactive import reactive

from fieldkit.ui.widgets.drawing import Drawing
from fieldkit.ui.widgets.frame import Frame
from fieldkit.ui.widgets.view_range import Axis

PAN, ZOOM = 0.1, 0.7
FAR = 8
"""Dots that the cursor moves with shift."""


class AxisPlot(Drawing, can_focus=True):
    """Keeps the stretch in view and the cursor; a subclass says what there is to see."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("left", "pan(-1)", "Pan", show=False, id="plot.left", tooltip="Pan to the left"),
        Binding("right", "pan(1)", "Pan", show=False, id="plot.right", tooltip="Pan to the right"),
        Binding("plus,equals_sign", "zoom(1)", "Zoom in", show=False, id="plot.zoom-in",
                tooltip="Zoom in, about the cursor"),
        Binding("minus", "zoom(-1)", "Zoom out", show=False, id="plot.zoom-out",
                tooltip="Zoom out"),
        Binding("0", "home", "Whole", show=False, id="plot.home", tooltip="Back to the first view"),
        Binding("comma", "cursor(-1)", "Cursor", show=False, id="plot.cursor-left",
                tooltip="Cursor to the left"),
        Binding("full_stop", "cursor(1)", "Cursor", show=False, id="plot.cursor-right",
                tooltip="Cursor to the right"),
        Binding("shift+left", f"cursor(-{FAR})", "Cursor", show=False, id="plot.cursor-far-left",
                tooltip="Cursor far to the left"),
        Binding("shift+right", f"cursor({FAR})", "Cursor", show=False, id="plot.cursor-far-right",
                tooltip="Cursor far to the right"),
        Binding("left_square_bracket", "mark(-1)", "Mark", show=False, id="plot.mark-before",
                tooltip="Cursor to the mark before"),
        Binding("right_square_bracket", "mark(1)", "Mark", show=False, id="plot.mark-next",
                tooltip="Cursor to the next mark"),
        Binding("escape", "no_cursor", "No cursor", show=False, id="plot.no-cursor",
                tooltip="Take the cursor away"),
    ]  # fmt: skip

    axis: reactive[Axis] = reactive(Axis(0.0, 1.0))
    """The stretch in view."""
    cursor: reactive[float | None] = reactive(None)
    """Where the cursor stands on the axis."""

    def limits(self) -> Axis:
        """As far as the view may go."""
        raise NotImplementedError

    def home(self) -> Axis:
        """The first view."""
        raise NotImplementedError

    def frame(self) -> Frame:
        """Where the plot lies in the content area."""
        raise NotImplementedError

    def marked(self) -> Sequence[float]:
        """Places the cursor can jump to."""
        raise NotImplementedError

    _held: tuple[int, Axis] | None = None
    """Column that the pointer took hold of, and the view it had then."""
    _dragged = False

    def axis_changed(self) -> None:
        """Tell the world; does nothing here."""

    def cursor_changed(self) -> None:
        """Tell the world; does nothing here."""

    def watch_axis(self) -> None:
        """Draw the other stretch and tell."""
        self.redraw()
        self.axis_changed()

    def watch_cursor(self) -> None:
        """Draw the cursor and tell."""
        self.redraw()
        self.cursor_changed()

    def on_focus(self) -> None:
        """The keys show while they work."""
        self.redraw()

    def on_blur(self) -> None:
        """And vanish with the focus."""
        self.redraw()

    def action_pan(self, direction: int) -> None:
        """Move the stretch in view."""
        self.axis = self.axis.panned(direction * PAN).kept_within(self.limits())

    def action_zoom(self, direction: int) -> None:
        """Shorten or lengthen the stretch in view, about the cursor or else its middle."""
        self._zoom(direction, self.cursor)

    def action_home(self) -> None:
        """Back to the first view."""
        self.axis = self.home()

    def action_cursor(self, dots: int) -> None:
        """Move the cursor by dot columns; the first time it appears in the middle."""
        if self.cursor is None or not self.axis.holds(self.cursor):
            self.cursor = float(self.axis.value(0.5))
            return
        share = float(self.axis.share(self.cursor)) + dots / max(1, 2 * self.frame().columns)
        self.cursor = float(self.axis.value(min(1.0, max(0.0, share))))

    def action_mark(self, direction: int) -> None:
        """Put the cursor on the next mark, and bring it into view."""
        here = self.cursor if self.cursor is not None else self._before_all(direction)
        ahead = [mark for mark in self.marked() if (mark - here) * direction > 1e-9]
        if ahead:
            self.cursor = min(ahead) if direction > 0 else max(ahead)
            self.bring_into_view(self.cursor)

    def _before_all(self, direction: int) -> float:
        return self.axis.low - 1e-6 if direction > 0 else self.axis.high + 1e-6

    def bring_into_view(self, value: float) -> None:
        """Pan so that a value outside the view comes to its middle."""
        if not self.axis.holds(value):
            share = float(self.axis.share(value)) - 0.5
            self.axis = self.axis.panned(share).kept_within(self.limits())

    def action_no_cursor(self) -> None:
        """Take the cursor away."""
        self.cursor = None

    def on_mouse_down(self, event: events.MouseDown) -> None:
        """Take hold of the picture."""
        offset = event.get_content_offset(self)
        if offset is not None and event.button == 1:
            self._held, self._dragged = (event.screen_x, self.axis), False
            self.capture_mouse()

    def on_mouse_move(self, event: events.MouseMove) -> None:
        """What was taken hold of follows the pointer."""
        columns = self.frame().columns
        if self._held is None or not columns:
            return
        column, axis = self._held
        moved = event.screen_x - column
        self._dragged = self._dragged or moved != 0
        if self._dragged:
            self.axis = axis.panned(-moved / columns).kept_within(self.limits())

    def on_mouse_up(self, _event: events.MouseUp) -> None:
        """Let go."""
        self._held = None
        self.release_mouse()

    def on_click(self, event: events.Click) -> None:
        """The cursor goes where the pointer is, unless it has just dragged the picture."""
        if self._dragged:
            self._dragged = False
            return
        value = self._value_under(event)
        if value is not None:
            self.cursor = value

    def on_mouse_scroll_up(self, event: events.MouseScrollUp) -> None:
        """Zoom in about the pointer."""
        self._wheel(event, 1)

    def on_mouse_scroll_down(self, event: events.MouseScrollDown) -> None:
        """Zoom out about the pointer."""
        self._wheel(event, -1)

    def _wheel(self, event: events.MouseEvent, direction: int) -> None:
        event.stop()
        if event.shift:
            self.action_pan(-direction)
        else:
            self._zoom(direction, self._value_under(event))

    def _zoom(self, direction: int, about: float | None) -> None:
        if about is None or not self.axis.holds(about):
            about = float(self.axis.value(0.5))
        factor = ZOOM if direction > 0 else 1 / ZOOM
        self.axis = self.axis.zoomed(factor, about).kept_within(self.limits())

    def _value_under(self, event: events.MouseEvent) -> float | None:
        offset = event.get_content_offset(self)
        return self.frame().value_at(offset.x) if offset is not None else None
