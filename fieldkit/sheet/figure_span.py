"""The span to scale: pipe, supports, masses, sensors, blows, and where the chosen change goes."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from fieldkit.job.document import Job
from fieldkit.quantity import show
from fieldkit.sheet.content import Figure
from fieldkit.sheet.drawing import (
    BAND_CORE,
    FIRST,
    GRID,
    INK,
    MUTED,
    PAPER,
    SECOND,
    THIRD,
    WIDTH_IN,
    drawn,
    svg_of,
)
from fieldkit.sheet.label_room import Box, Wish, places
from fieldkit.span.layout import Span

Array = NDArray[np.float64]

COS_30 = math.sqrt(3) / 2
VIEWS = {
    "elevation, x to the right and z up": ((1, 0, 0), (0, 0, 1)),
    "elevation, y to the right and z up": ((0, 1, 0), (0, 0, 1)),
    "plan, x to the right and y up": ((1, 0, 0), (0, 1, 0)),
    "isometric, x up to the right, y up to the left, z up": (
        (COS_30, -COS_30, 0.0), (0.5, 0.5, 1.0),
    ),
}  # fmt: skip
"""Across and up of each, for unit vectors x, y and z."""
MOST_HEIGHT_IN, LEAST_HEIGHT_IN = 4.2, 1.9
MARGIN_IN = 0.62


@dataclass(frozen=True)
class Item:
    """One thing on the pipe: its letter and number stand in the tables too."""

    at_m: float
    label: str
    marker: str
    colour: str
    off_pt: float
    """How far its label stands off the pipe; negative on the other side."""


def items(job: Job, change_at_m: Sequence[float] = ()) -> list[Item]:
    """Supports, masses, sensors, places struck and places to change, as they are numbered."""
    found = [
        Item(support.at_m, f"S{i}", "^", INK, -17)
        for i, support in enumerate(job.span.supports, start=1)
    ]
    found += [
        Item(mass.at_m, f"M{i}", "o", THIRD, 15) for i, mass in enumerate(job.span.masses, start=1)
    ]
    found += [Item(at_m, "sensor", "s", FIRST, 28) for at_m in sensors(job)]
    found += [Item(at_m, "struck", "*", SECOND, 41) for at_m in struck(job)]
    found += [Item(at_m, "change 1", "D", BAND_CORE, -30) for at_m in change_at_m]
    return found


def sensors(job: Job) -> list[float]:
    """Stations of the sensors, each once."""
    return sorted({entry.at_m for entry in job.recordings if entry.at_m is not None})


def struck(job: Job) -> list[float]:
    """Stations that a hammer with a force gauge struck, where the job says so."""
    hammers = [entry.hammer for entry in job.recordings if entry.hammer is not None]
    return sorted({hammer.at_m for hammer in hammers if hammer.at_m is not None})


def span_figure(job: Job, change_at_m: Sequence[float] = ()) -> Figure:
    """The centre line to scale with everything on it."""
    stations, points = _centre_line(job.span)
    view = _view(points)
    flat = _projected(view, points)
    size = np.ptp(flat, axis=0)
    per_m = min(
        (WIDTH_IN - 2 * MARGIN_IN) / max(float(size[0]), 1e-3),
        (MOST_HEIGHT_IN - 2 * MARGIN_IN) / max(float(size[1]), 1e-3),
    )
    height = min(max(per_m * float(size[1]) + 2 * MARGIN_IN, LEAST_HEIGHT_IN), MOST_HEIGHT_IN)
    with drawn(height) as figure:
        axes = figure.add_axes((0, 0, 1, 1))
        axes.set_axis_off()
        middle = (flat.min(axis=0) + flat.max(axis=0)) / 2
        half = np.array([WIDTH_IN, height]) / 2 / per_m
        axes.set_xlim(middle[0] - half[0], middle[0] + half[0])
        axes.set_ylim(middle[1] - half[1], middle[1] + half[1])
        _pipe(axes, flat, 72 * per_m * job.span.pipe.outside_diameter_m)
        _keep_out(axes, job, stations, flat)
        _draw_items(axes, job, items(job, change_at_m), Drawn(stations, flat, per_m))
        _scale_bar(axes, per_m, job.units)
        shown = _caption(job, view, bool(change_at_m))
        return Figure(shown, svg_of(figure, "span", shown))


def _caption(job: Job, view: str, changed: bool) -> str:
    others = [f"S{'' if len(job.span.supports) == 1 else ' with its number'} a support"]
    others += ["M a mass"] if job.span.masses else []
    others += ["a square the sensor"] if sensors(job) else []
    others += ["a star where it was struck"] if struck(job) else []
    others += ["a diamond where the first change goes"] if changed else []
    return (
        f"The span to scale, {view}, the pipe as thick as it is: {', '.join(others)}; stations "
        "run along the centre line, corner to corner"
        + (", and a red stretch is one where nothing may be attached" * bool(job.goal.keep_out_m))
    )


def _centre_line(span: Span) -> tuple[Array, Array]:
    stations = np.concatenate(
        [np.linspace(p.start_m, p.end_m, 13) for p in span.centre_line.pieces]
    )
    return stations, np.array([span.centre_line.at(float(s))[0] for s in stations])


def _view(points: Array) -> str:
    """The flat view that hides no run of the pipe, else the isometric one."""
    runs = np.abs(np.diff(points, axis=0)).sum(axis=0)
    present = runs > 0.01 * runs.sum()
    for name, (across, up) in VIEWS.items():
        seen = np.abs(np.array([across, up])).max(axis=0) > 0
        if np.all(seen[present]):
            return name
    return list(VIEWS)[-1]


def _projected(view: str, points: Array) -> Array:
    flat: Array = points @ np.array(VIEWS[view]).T
    return flat


def _pipe(axes: Any, flat: Array, thick_pt: float) -> None:
    """The wall as two edges: a thick line with a thinner one of the page's colour in it."""
    thick = max(thick_pt, 2.5)
    axes.plot(*flat.T, color=INK, linewidth=thick, solid_capstyle="butt", zorder=2)
    axes.plot(*flat.T, color=GRID, linewidth=thick - 1.3, solid_capstyle="butt", zorder=2.1)
    axes.plot(*flat.T, color=MUTED, linewidth=0.5, linestyle=(0, (8, 2, 2, 2)), zorder=2.2)


def _keep_out(axes: Any, job: Job, stations: Array, flat: Array) -> None:
    """Where nothing can be attached."""
    for low_m, high_m in job.goal.keep_out_m:
        at = np.linspace(max(low_m, 0.0), min(high_m, job.span.length_m), 12)
        line = np.column_stack([np.interp(at, stations, flat[:, i]) for i in range(2)])
        axes.plot(*line.T, color=BAND_CORE, linewidth=2.2, zorder=2.3, alpha=0.8)


@dataclass(frozen=True)
class Drawn:
    """The drawn centre line: stations (n,), where they lie (n, 2) in metres, inches to a metre."""

    stations: Array
    flat: Array
    per_m: float

    def at(self, station_m: float) -> Array:
        """Where a station lies, metres right and up."""
        return np.array([np.interp(station_m, self.stations, self.flat[:, i]) for i in range(2)])

    def points(self) -> Array:
        """(n, 2) of the line close enough to see whether a label lies on it, in points."""
        fine = np.linspace(self.stations[0], self.stations[-1], 240)
        return 72 * self.per_m * np.array([self.at(float(station)) for station in fine])


def _draw_items(axes: Any, job: Job, found: Sequence[Item], drawn_line: Drawn) -> None:
    half_pt = 36 * drawn_line.per_m * job.span.pipe.outside_diameter_m
    wishes = [
        Wish(
            f"{item.label}, {show(item.at_m, 'length', job.units, 3)}",
            72 * drawn_line.per_m * drawn_line.at(item.at_m),
            _normal(item.at_m, drawn_line),
            item.off_pt + math.copysign(half_pt, item.off_pt),
        )
        for item in found
    ]
    scale = 72 * drawn_line.per_m
    page = Box(*(scale * np.array([*axes.get_xlim(), *axes.get_ylim()])))
    chosen = places(wishes, drawn_line.points(), half_pt, page)
    for item, wish, place in zip(found, wishes, chosen, strict=True):
        at = drawn_line.at(item.at_m)
        axes.plot(
            *at, item.marker, color=item.colour, markersize=7.5, zorder=4,
            markeredgecolor=PAPER, markeredgewidth=0.8,
        )  # fmt: skip
        axes.annotate(
            wish.text, at, tuple(place.offset), textcoords="offset points", fontsize=7.5,
            color=item.colour, zorder=5, ha=place.side, va="center",
            arrowprops={
                "arrowstyle": "-", "color": item.colour, "linewidth": 0.5,
                "shrinkA": 0, "shrinkB": 3,
            },
        )  # fmt: skip


def _normal(at_m: float, line: Drawn) -> Array:
    """Across the drawn line, up or to the left where that is level."""
    step = 0.02 * (line.stations[-1] - line.stations[0])
    ends = [line.at(at_m - step), line.at(at_m + step)]
    along = ends[1] - ends[0]
    along = along / max(float(np.linalg.norm(along)), 1e-12)
    normal = np.array([-along[1], along[0]])
    upward = normal[1] if abs(normal[1]) > 0.2 else -normal[0]
    return normal if upward > 0 else -normal


def _scale_bar(axes: Any, per_m: float, units: str) -> None:
    """A round length at the lower left."""
    foot = 0.3048
    choices = [n * foot for n in (0.5, 1, 2, 5, 10, 20, 50)] if units == "US" else [
        0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0, 20.0,
    ]  # fmt: skip
    bar_m = max([c for c in choices if c * per_m <= 1.4], default=choices[0])
    left, low = axes.get_xlim()[0] + 0.12 / per_m, axes.get_ylim()[0] + 0.14 / per_m
    axes.plot([left, left + bar_m], [low, low], color=INK, linewidth=1.4, solid_capstyle="butt")
    axes.annotate(
        show(bar_m, "length", units, 2), (left + bar_m, low), (5, 0), textcoords="offset points",
        va="center", fontsize=7.5, color=INK,
    )  # fmt: skip
