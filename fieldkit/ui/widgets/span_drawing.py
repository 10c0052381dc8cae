"""The span on screen, to scale, seen from the side that shows most."""

from __future__ import annotations

from collections.abc import Callable
from typing import ClassVar

from textual.binding import Binding, BindingType
from textual.reactive import reactive

from fieldkit.span.layout import Span
from fieldkit.ui.widgets.drawing import Drawing, write_empty
from fieldkit.ui.widgets.projection import PLANES
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.span_art import Picture, Shape, ShapeLine, chosen_plane, draw_span
from fieldkit.ui.widgets.ticks import amount_text

__all__ = ["ShapeLine", "SpanDrawing"]

EMPTY = "No span yet: describe its first leg to see it here"


def _metres(length_m: float) -> str:
    return f"{length_m:.4g} m"


def _kilograms(mass_kg: float) -> str:
    return amount_text(mass_kg, "kg")


class SpanDrawing(Drawing, can_focus=True):
    """Centre line, supports, masses, a mode shape over it, and one station to point at."""

    COMPONENT_PREFIX = "span"
    COMPONENT_CLASSES: ClassVar[set[str]] = {
        f"span--{name}" for name in ("pipe", "shape", "support", "mass", "end", "marked", "note")
    }
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
    }
    """
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("v", "turn", "View", id="span-drawing.turn",
                tooltip="See it from another side"),
    ]  # fmt: skip

    plane: reactive[int | None] = reactive(None)
    """Number of the plane in PLANES; None chooses the one that shows most."""

    def __init__(
        self, *, name: str | None = None, id: str | None = None, classes: str | None = None
    ) -> None:
        super().__init__(name=name, id=id, classes=classes)
        self.span: Span | None = None
        self.shape: Shape | None = None
        self.marked: tuple[float, str] | None = None
        self.length_text: Callable[[float], str] = _metres
        self.mass_text: Callable[[float], str] = _kilograms

    def show(
        self,
        span: Span | None,
        mode: Shape | None = None,
        *,
        length_text: Callable[[float], str] | None = None,
        mass_text: Callable[[float], str] | None = None,
    ) -> None:
        """Draw this span, and a mode shape over it; the texts put metres and kilograms in words."""
        if span is None or self.span is None or span.legs != self.span.legs:
            self.plane = None
        self.span, self.shape = span, mode
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
        plane = PLANES[self.plane] if self.plane is not None else None
        return Picture(self.span, self.shape, self.length_text, self.mass_text, plane, self.marked)

    def watch_plane(self) -> None:
        """Draw from the other side."""
        self.redraw()

    def action_turn(self) -> None:
        """The next side; after the last one the best is chosen again."""
        picture = self._picture
        if picture is not None:
            shown = PLANES.index(chosen_plane(picture))
            self.plane = (shown + 1) % len(PLANES)
