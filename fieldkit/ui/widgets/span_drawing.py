"""The span on screen, to scale, seen from the side that shows most."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from typing import ClassVar

from textual import events
from textual.binding import Binding, BindingType
from textual.geometry import Region
from textual.reactive import reactive
from textual.strip import Strip
from textual.timer import Timer

from fieldkit.span.layout import Span
from fieldkit.ui.widgets.drawing import Drawing, write_empty
from fieldkit.ui.widgets.projection import FREE_START, PLANES, Plane, turned
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.span_art import (
    Item,
    Picture,
    Shape,
    ShapeLine,
    chosen_plane,
    draw_span,
)
from fieldkit.ui.widgets.ticks import amount_text

__all__ = ["ShapeLine", "SpanDrawing"]

FRAMES_PER_S, FRAMES = 10, 16
"""Pictures a second, and pictures to a swing there and back."""
TURN_DEG, TILT_DEG = 15, 15
EMPTY = "No span yet: describe its first leg to see it here"


def _metres(length_m: float) -> str:
    return f"{length_m:.4g} m"


def _kilograms(mass_kg: float) -> str:
    return amount_text(mass_kg, "kg")


class SpanDrawing(Drawing, can_focus=True):
    """Centre line, supports, masses, a mode shape over it, and one station to point at."""

    COMPONENT_PREFIX = "span"
    COMPONENT_CLASSES: ClassVar[set[str]] = {
        f"span--{name}"
        for name in (
            "pipe", "shape", "support", "mass", "end", "marked", "note", "node", "sensor", "tap",
        )
    }  # fmt: skip
    DEFAULT_CSS = """
    SpanDrawing {
        height: 1fr; min-height: 3;
        & > .span--pipe { color: $foreground; text-style: bold; }
        & > .span--shape { color: $text-accent; }
        & > .span--support { color: $text-primary; }
        & > .span--mass { color: $text-warning; }
        & > .span--end { color: $text-muted; }
        & > .span--marked { color: $text-success; text-style: bold reverse; }
        & > .span--note { color: $text-muted; }
        & > .span--node { color: $text-accent; }
        & > .span--sensor { color: $text-success; }
        & > .span--tap { color: $text-success; text-style: bold; }
    }
    """
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("v", "turn", "View", id="span-drawing.turn",
                tooltip="See it from another side"),
        Binding("space", "move", "Motion", show=False, id="span-drawing.move",
                tooltip="Let the mode shape swing, or hold it still"),
        Binding("shift+left", f"turn_by({-TURN_DEG}, 0)", "Turn", show=False,
                id="span-drawing.turn-left", tooltip="Turn the free view"),
        Binding("shift+right", f"turn_by({TURN_DEG}, 0)", "Turn", show=False,
                id="span-drawing.turn-right", tooltip="Turn the free view the other way"),
        Binding("shift+up", f"turn_by(0, {TILT_DEG})", "Tilt", show=False,
                id="span-drawing.tilt-up", tooltip="See the span from farther above"),
        Binding("shift+down", f"turn_by(0, {-TILT_DEG})", "Tilt", show=False,
                id="span-drawing.tilt-down", tooltip="See the span from farther below"),
    ]  # fmt: skip

    plane: reactive[int | None] = reactive(None)
    """Number of the plane in PLANES; None chooses the one that shows most."""
    free: reactive[tuple[int, int] | None] = reactive(None)
    """Turn and tilt of the free view, degrees; None where a plane is seen."""
    moving: reactive[bool] = reactive(False)
    """Whether the mode shape swings."""

    def __init__(
        self, *, name: str | None = None, id: str | None = None, classes: str | None = None
    ) -> None:
        super().__init__(name=name, id=id, classes=classes)
        self.span: Span | None = None
        self.shape: Shape | None = None
        self.marked: tuple[float, str] | None = None
        self.length_text: Callable[[float], str] = _metres
        self.mass_text: Callable[[float], str] = _kilograms
        self.also: tuple[Item, ...] = ()
        self._frame = 0
        self._frames: dict[tuple[object, ...], list[Strip]] = {}
        self._clock: Timer | None = None

    def show(
        self,
        span: Span | None,
        mode: Shape | None = None,
        *,
        length_text: Callable[[float], str] | None = None,
        mass_text: Callable[[float], str] | None = None,
        also: Sequence[Item] = (),
    ) -> None:
        """Draw this span, and a mode shape over it; the texts put metres and kilograms in words.

        ``also`` are more things at stations: nodes, sensors, a place to tap.
        """
        if span is None or self.span is None or span.legs != self.span.legs:
            self.plane = self.free = None
        self.span, self.shape, self.also = span, mode, tuple(also)
        self.length_text = length_text or self.length_text
        self.mass_text = mass_text or self.mass_text
        self.redraw()

    def mark_station(self, at_m: float | None, label: str = "") -> None:
        """Point at a station, such as that of a chosen change; None takes the mark away."""
        self.marked = (at_m, label) if at_m is not None else None
        self.redraw()

    def draw(self, canvas: Canvas) -> None:
        """The span, or what is missing."""
        picture = self._picture
        if picture is None:
            write_empty(canvas, EMPTY)
        elif canvas.rows and canvas.columns:
            draw_span(canvas, picture)

    @property
    def _picture(self) -> Picture | None:
        if self.span is None:
            return None
        return Picture(
            self.span,
            self.shape,
            self.length_text,
            self.mass_text,
            self._plane,
            self.marked,
            self.also,
            math.sin(2 * math.pi * self._frame / FRAMES) if self._swings else None,
        )

    @property
    def _plane(self) -> Plane | None:
        if self.free is not None:
            return turned(*self.free)
        return PLANES[self.plane] if self.plane is not None else None

    @property
    def _swings(self) -> bool:
        return self.moving and self.shape is not None

    def redraw(self) -> None:
        """Forget every picture."""
        self._frames = {}
        super().redraw()

    def notify_style_update(self) -> None:
        """Colours changed: no picture is good any more."""
        super().notify_style_update()
        self._frames = {}

    def render_lines(self, crop: Region) -> list[Strip]:
        """A picture of the swing that was drawn before is shown again."""
        key = (self._frame, self.size, self.rich_style)
        if self._swings and key in self._frames:
            self._lines, self._drawn_size = self._frames[key], (self.size.width, self.size.height)
        found = super().render_lines(crop)
        if self._swings and self._lines is not None:
            self._frames[key] = self._lines
        return found

    def on_mount(self) -> None:
        """The clock of the swing; it stands still until there is something to swing."""
        self._clock = self.set_interval(1 / FRAMES_PER_S, self._tick, pause=not self.moving)

    def on_hide(self, _event: events.Hide) -> None:
        """Nobody looks: no frame is drawn."""
        if self._clock is not None:
            self._clock.pause()

    def on_show(self, _event: events.Show) -> None:
        """Go on where it was."""
        if self._clock is not None and self.moving:
            self._clock.resume()

    def _tick(self) -> None:
        if not self._swings or not self.is_on_screen or not self.screen.is_current:
            return
        self._frame = (self._frame + 1) % FRAMES
        self._lines = None
        self.refresh()

    def watch_moving(self) -> None:
        """Start from rest, or stand still at the largest motion."""
        self._frame = 0
        if self._clock is not None:
            (self._clock.resume if self.moving else self._clock.pause)()
        self.redraw()

    def watch_plane(self) -> None:
        """Draw from the other side."""
        self.redraw()

    def watch_free(self) -> None:
        """Draw from there."""
        self.redraw()

    def action_move(self) -> None:
        """Let the shape swing, or hold it still."""
        self.moving = not self.moving

    def action_turn(self) -> None:
        """The next side; after the free view the first plane."""
        picture = self._picture
        if picture is None:
            return
        if self.free is not None:
            self.free, self.plane = None, 0
            return
        shown = PLANES.index(chosen_plane(picture))
        if shown + 1 == len(PLANES):
            self.free = FREE_START
        else:
            self.plane = shown + 1

    def action_turn_by(self, turn_deg: int, tilt_deg: int) -> None:
        """Turn and tilt the free view; from a plane it starts where the isometric one is."""
        if self.span is None:
            return
        turn, tilt = self.free or FREE_START
        self.free = ((turn + turn_deg + 180) % 360 - 180, min(90, max(-30, tilt + tilt_deg)))
