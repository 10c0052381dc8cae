"""Draw a span to scale: its centre line, supports, masses, a mode shape and a chosen station."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray
from rich.cells import cell_len

from fieldkit.span.layout import Span
from fieldkit.ui.widgets.projection import (
    Fit,
    Plane,
    best_plane,
    centre_line_points,
    fit,
    positions,
)
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.ticks import round_down

Floats = NDArray[np.float64]
KIND_GLYPHS = {
    "anchor": "▓", "nozzle": "▣", "clamp": "╫", "u-bolt": "∩", "guide": "‖",
    "rest": "▲", "hanger": "┬", "branch": "▙", "brace": "╱", "free": "○",
}  # fmt: skip
BESIDE = {"rest": 1, "hanger": -1}
"""Kinds that stand below or hang above the pipe: rows from it, down counted positive."""
MASS_GLYPH, MARK_GLYPH = "●", "◎"
FREE_LABELS = ("marked", "tap")
SHAPE_SHARE, LEAST_SHAPE_DOTS = 0.2, 3.0
MARGIN_SHARE, MOST_ABOVE, MOST_BELOW = 0.3, 2, 3
CELL_HEIGHT = 2
"""Widths of a cell."""


class Shape(Protocol):
    """Displacement along the span, as a computed mode or a ShapeLine has it."""

    @property
    def station_m(self) -> Floats:
        """(n,)"""

    @property
    def shape(self) -> Floats:
        """(n, 3)"""


@dataclass(frozen=True)
class ShapeLine:
    """A mode shape to draw over a span."""

    station_m: Floats
    """(n,)"""
    shape: Floats
    """(n, 3) displacement; only its form counts, it is scaled to be seen."""
    label: str = ""


@dataclass(frozen=True)
class Item:
    """Something at a station: its glyph and its label, longest wording first."""

    at_m: float
    glyph: str
    wordings: tuple[str, ...]
    ink: str
    rows_off: int = 0


@dataclass(frozen=True)
class Picture:
    """What is to be drawn, and in which words."""

    span: Span
    shape: Shape | None
    length_text: Callable[[float], str]
    mass_text: Callable[[float], str]
    plane: Plane | None = None
    """None leaves the choice to the drawing."""
    marked: tuple[float, str] | None = None
    """A station to point at, and what for."""
    also: tuple[Item, ...] = ()
    """More to show at stations, less important than masses and supports."""
    swing: float | None = None
    """How far the shape swings just now, -1 to 1; None draws it at rest at its largest."""


def chosen_plane(picture: Picture) -> Plane:
    """The plane asked for, or the one that shows pipe and motion best."""
    if picture.plane is not None:
        return picture.plane
    stations, points = centre_line_points(picture.span)
    shape = picture.shape
    return best_plane(points, _displacement(shape, stations) if shape is not None else None)


def draw_span(canvas: Canvas, picture: Picture) -> None:
    """Draw everything; on the smallest canvas only the line and the glyphs are left."""
    plane = chosen_plane(picture)
    stations, points = centre_line_points(picture.span)
    flat = plane.project(points)
    roomy = canvas.columns >= 24 and canvas.rows >= 6
    side = min(10, canvas.columns / 6) if roomy else 1
    above, below = _margins(canvas.rows) if roomy else (0, 0)
    onto = fit(
        flat,
        2 * side,
        2 * (canvas.columns - side) - 1,
        4 * above,
        4 * (canvas.rows - below) - 1,
    )
    line = onto.dots(flat)
    items = _items(picture)
    places = _places(onto, plane, picture.span, items, canvas.rows - bool(below))

    def draw_on(paper: Canvas, swings: tuple[float, ...]) -> None:
        for swing in swings:
            _draw_shape(paper, picture, plane, stations, line, swing)
        paper.polyline(line[:, 0], line[:, 1], "pipe")
        for item, (column, row) in reversed(list(zip(items, places, strict=True))):
            paper.write(row, column, item.glyph, item.ink)

    still = picture.swing is None
    draw_on(canvas, (1.0,) if picture.swing is None else (picture.swing,))
    if not roomy:
        return
    room = canvas if still else Canvas(canvas.columns, canvas.rows)
    if not still:
        draw_on(room, (-1.0, 1.0))
    for paper in (canvas,) if still else (canvas, room):
        _write_foot(paper, picture, plane, onto)
    for item, place in zip(items, places, strict=True):
        found = _label_place(room, place, item, [other for other in places if other != place])
        for paper in (canvas,) if still else (canvas, room):
            if found is not None:
                paper.write(*found, item.ink)


def _margins(rows: int) -> tuple[int, int]:
    """Rows kept free above and below the pipe, the foot among them; the pipe has most of them."""
    spare = int(MARGIN_SHARE * rows)
    above = min(MOST_ABOVE, spare // 2)
    return above, min(MOST_BELOW, max(1, spare - above))


def _displacement(shape: Shape, stations: Floats) -> Floats:
    """Shape (n, 3) at other stations, largest 1."""
    order = np.argsort(shape.station_m, kind="stable")
    at, value = np.asarray(shape.station_m)[order], np.asarray(shape.shape)[order]
    moved = np.column_stack([np.interp(stations, at, value[:, axis]) for axis in range(3)])
    largest = float(np.linalg.norm(moved, axis=1).max(initial=0.0))
    return moved / largest if math.isfinite(largest) and largest > 0 else np.zeros_like(moved)


def _draw_shape(
    canvas: Canvas,
    picture: Picture,
    plane: Plane,
    stations: Floats,
    line: Floats,
    swing: float,
) -> None:
    shape = picture.shape
    if shape is None:
        return
    fine = np.linspace(stations[0], stations[-1], 200)
    seen = plane.project(_displacement(shape, fine)) * np.array([1.0, -1.0])
    reach = max(LEAST_SHAPE_DOTS, SHAPE_SHARE * min(canvas.dot_rows, 0.5 * canvas.dot_columns))
    reach *= swing
    along = np.column_stack([np.interp(fine, stations, line[:, axis]) for axis in range(2)])
    moved = along + reach * seen
    canvas.polyline(moved[:, 0], moved[:, 1], "shape", dash=2)


def _items(picture: Picture) -> list[Item]:
    """The most important first: chosen station, masses, supports, ends."""
    span, length = picture.span, picture.length_text
    items = []
    if picture.marked is not None:
        at, words = picture.marked
        wordings = (f"{words} {length(at)}", words, length(at)) if words else (length(at),)
        items.append(Item(at, MARK_GLYPH, wordings, "marked"))
    for mass in span.masses:
        weight = picture.mass_text(mass.mass_kg)
        items.append(
            Item(mass.at_m, MASS_GLYPH, (f"{mass.name} {weight}", mass.name, weight), "mass")
        )
    for support in span.supports:
        place = length(support.at_m)
        wordings = (f"{support.kind} {place}", support.kind, place)
        glyph = KIND_GLYPHS.get(support.kind, "?")
        items.append(Item(support.at_m, glyph, wordings, "support", BESIDE.get(support.kind, 0)))
    held = [support.at_m for support in span.supports]
    for at, name in ((0.0, "start"), (span.length_m, "end")):
        if not any(abs(at - other) < 1e-3 for other in held):
            items.append(Item(at, "○", (f"{name} {length(at)}", name), "end"))
    return [*items, *picture.also]


def _places(
    onto: Fit, plane: Plane, span: Span, items: list[Item], rows: int
) -> list[tuple[int, int]]:
    """(column, row) of each glyph; what would cover an earlier one moves a cell aside."""
    found: list[tuple[int, int]] = []
    for item in items:
        column, row = _cell(onto, plane, span, item)
        row = min(max(row, 0), rows - 1)
        asides = [(column + a, row + d) for a, d in ((0, 0), (0, 1), (0, -1), (1, 0), (-1, 0))]
        free = [place for place in asides if place not in found and 0 <= place[1] < rows]
        found.append(free[0] if free else (column, row))
    return found


def _cell(onto: Fit, plane: Plane, span: Span, item: Item) -> tuple[int, int]:
    at = min(max(item.at_m, 0.0), span.length_m)
    dot = onto.dots(plane.project(positions(span, [at])))[0]
    column, row = np.rint(dot).astype(int) // np.array([2, 4])
    return int(column), int(row) + (item.rows_off if plane.up[2] else 0)


def _label_place(
    canvas: Canvas, place: tuple[int, int], item: Item, others: list[tuple[int, int]]
) -> tuple[int, int, str] | None:
    """(row, column, wording) of the longest that fits nearer to its glyph than to any other.

    The chosen station and the place to tap have inks of their own, so their labels may stand
    farther off if need be.
    """
    rivalries = (others, []) if item.ink in FREE_LABELS else (others,)
    for wording in item.wordings:
        for rivals in rivalries:
            found = _label_room(canvas, place, cell_len(wording), rivals)
            if found is not None:
                return (*found, wording)
    return None


def _label_room(
    canvas: Canvas, place: tuple[int, int], width: int, rivals: list[tuple[int, int]]
) -> tuple[int, int] | None:
    """(row, first column) of blank cells above the foot, nearer to ``place`` than to rivals."""
    for down, start in _around(place[0], width):
        row = place[1] + down
        first, end = max(0, start - 1), min(canvas.columns, start + width + 1)
        fits = start >= 0 and start + width <= canvas.columns
        if fits and row < canvas.rows - 1 and canvas.blank(row, first, end):
            own = _distance(place, row, start, width)
            if all(own < _distance(rival, row, start, width) for rival in rivals):
                return row, start
    return None


def _distance(place: tuple[int, int], row: int, start: int, width: int) -> float:
    """From a glyph to the nearest end of a label, in widths of a cell."""
    column = place[0]
    across = max(start - column, column - (start + width - 1), 0)
    return math.hypot(across, CELL_HEIGHT * (place[1] - row))


def _around(column: int, width: int) -> list[tuple[int, int]]:
    """(rows down, first column) of places for a label: centred, then beside, then farther."""
    centred, right, left = column - width // 2, column + 2, column - width - 1
    near = [(1, centred), (-1, centred), (0, right), (0, left)]
    shifted = (column, right, column - width + 1, left)
    beside = [(down, start) for down in (1, -1) for start in shifted]
    far = [(down, start) for down in (2, -2, 3, -3) for start in (centred, right, left)]
    return near + beside + far


def _write_foot(canvas: Canvas, picture: Picture, plane: Plane, onto: Fit) -> None:
    """View and axes at the left, then the mode, a scale bar at the right where there is room."""
    row = canvas.rows - 1
    column = canvas.write(row, 0, f"{plane.name}  {plane.key}", "note") + 2
    label = getattr(picture.shape, "label", "")
    if label and canvas.free(row, column, column + cell_len(label)):
        column = canvas.write(row, column, label, "shape") + 2
    bar_m = round_down(0.3 * canvas.dot_columns / onto.dots_per_m)
    cells = round(bar_m * onto.dots_per_m / 2)
    text = f"├{'─' * (cells - 2)}┤ {picture.length_text(bar_m)}"
    if cells >= 3 and canvas.columns - cell_len(text) >= column:
        canvas.write(row, canvas.columns - cell_len(text), text, "note")
