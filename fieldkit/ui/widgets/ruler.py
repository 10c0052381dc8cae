"""The frequency ruler at the foot of every view."""

from __future__ import annotations

from typing import ClassVar

from fieldkit.ui.widgets.drawing import Drawing
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.ruler_art import RulerData, draw_ruler

__all__ = ["FrequencyRuler", "RulerData"]

LEGEND = (
    "Hatched: keep out, dark: the excitation itself. "
    "Filled mark: inside a band; half filled: its doubt reaches into one; open: clear. "
    "A bar spans 5 % to 95 %."
)


class FrequencyRuler(Drawing):
    """One frequency axis: bands, measured modes, modes now, modes after the chosen change."""

    COMPONENT_PREFIX = "ruler"
    COMPONENT_CLASSES: ClassVar[set[str]] = {
        f"ruler--{name}"
        for name in (
            "name", "axis", "band", "margin", "band-name", "measured", "now", "after",
            "hit", "touch",
        )
    }  # fmt: skip
    DEFAULT_CSS = """
    FrequencyRuler {
        height: 5;
        & > .ruler--name { color: $text-muted; }
        & > .ruler--axis { color: $text-muted; }
        & > .ruler--band { color: $error; background: $error 25%; }
        & > .ruler--margin { color: $error 40%; background: $error 10%; }
        & > .ruler--band-name { color: $text-error; }
        & > .ruler--measured { color: $text-primary; }
        & > .ruler--now { color: $foreground; }
        & > .ruler--after { color: $text-success; }
        & > .ruler--touch { color: $text-warning; text-style: bold; }
        & > .ruler--hit { color: $text-error; text-style: bold; }
    }
    """

    def __init__(
        self, *, name: str | None = None, id: str | None = None, classes: str | None = None
    ) -> None:
        super().__init__(name=name, id=id, classes=classes)
        self.data = RulerData(200.0)
        self.tooltip = LEGEND

    def show(self, data: RulerData) -> None:
        """Draw this."""
        self.data = data
        self.redraw()

    def draw(self, canvas: Canvas) -> None:
        """The ruler; rows without data say so."""
        draw_ruler(canvas, self.data)
