"""The span on a drawing: as it is, or with the chosen fix pointed at."""

from __future__ import annotations

from typing import TYPE_CHECKING

from fieldkit.quantity import show
from fieldkit.ui.desk import Desk
from fieldkit.ui.span_marks import measuring_items, mode_items, place_to_tap
from fieldkit.ui.units import length
from fieldkit.ui.widgets import SpanDrawing
from fieldkit.ui.widgets.span_art import Item

if TYPE_CHECKING:
    from fieldkit.detune.fixes import Change
    from fieldkit.span.layout import Span
    from fieldkit.span.modes import Mode


def draw_plain(drawing: SpanDrawing, desk: Desk, mode: Mode | None) -> None:
    """The span as it is described, with a mode shape."""
    drawing.mark_station(None)
    _show(drawing, desk, desk.job.span if desk.job else None, mode, measuring=True)


def draw_fixed(drawing: SpanDrawing, desk: Desk, number: int = 0) -> None:
    """The span with the chosen fix, with one of its mode shapes; as it is where none is chosen."""
    if desk.job is None or desk.chosen is None:
        draw_plain(drawing, desk, None)
        return
    modes = desk.chosen_modes
    change = desk.chosen.change
    span = change.apply(desk.job.span)
    at_m = station_of(change, span)
    drawing.mark_station(at_m, f"change {desk.chosen.rank}")
    _show(drawing, desk, span, modes[min(number, len(modes) - 1)] if modes else None)


def station_of(change: Change, span: Span) -> float | None:
    """Where a change is made on the changed span; None where it has no one place."""
    for step in change.as_json().values():
        if not isinstance(step, dict):
            return None
        if "index" in step:
            items = span.masses if change.kind == "mass" else span.supports
            return items[step["index"]].at_m
        return step.get("at_m")
    return None


def _show(
    drawing: SpanDrawing,
    desk: Desk,
    span: Span | None,
    mode: Mode | None,
    measuring: bool = False,
) -> None:
    units = desk.units

    def length_text(value_m: float) -> str:
        return length(value_m, units)

    also: tuple[Item, ...] = mode_items(mode, span, length_text) if span is not None else ()
    if measuring and desk.job is not None:
        place = place_to_tap(desk.modes_of("tapped"), desk.job, desk.bands)
        also = (*measuring_items(desk.job, place, length_text), *also)
    drawing.show(
        span,
        mode,
        length_text=length_text,
        mass_text=lambda value_kg: show(value_kg, "mass", units),
        also=also,
    )
