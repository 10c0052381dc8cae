"""Draw frequency across and time downward, levels as shades."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from fieldkit.ui.widgets.band_art import BandShade, write_band_row
from fieldkit.ui.widgets.frame import Frame
from fieldkit.ui.widgets.labels import write_ticks
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.ticks import tick_labels
from fieldkit.ui.widgets.view_range import Axis

Floats = NDArray[np.float64]
SHADES = " ·░▒▓█"
GUTTER = 8
ORDER = "┊"


@dataclass(frozen=True)
class WaterfallData:
    """n times with m levels each."""

    time_text: Sequence[str]
    """(n,)"""
    frequency_hz: Floats
    """(m,) middles of columns, evenly spaced."""
    rms: Floats
    """(n, m)"""
    orders: Sequence[BandShade] = ()

    @property
    def axis(self) -> Axis:
        """The frequency axis."""
        half = 0.5 * float(self.frequency_hz[1] - self.frequency_hz[0])
        return Axis(float(self.frequency_hz[0]) - half, float(self.frequency_hz[-1]) + half)


def waterfall_frame(data: WaterfallData, columns: int, rows: int) -> Frame:
    """A row for the orders above, one for the numbers below, times at the left."""
    left = GUTTER if columns >= 40 else 0
    top = 1 if rows >= 4 else 0
    return Frame(left, columns, top, max(top, rows - (1 if rows >= 4 else 0)), data.axis)


def rows_of_times(times: int, rows: int) -> NDArray[np.intp]:
    """(rows + 1,) first time of each row; every time is in some row where there are enough."""
    return np.minimum(np.linspace(0, times, rows + 1).astype(np.intp), times)


def draw_waterfall(
    canvas: Canvas, data: WaterfallData, depth_db: float, at: tuple[int, float] | None = None
) -> None:
    """Levels down to ``depth_db`` below the highest; ``at`` is the cursor's time and frequency."""
    frame = waterfall_frame(data, canvas.columns, canvas.rows)
    if not frame.columns or not frame.rows:
        return
    shades = shaded(data, frame, depth_db)
    row_of = rows_of_times(len(data.rms), frame.rows)
    for row in range(frame.rows):
        canvas.write(frame.top + row, frame.left, "".join(SHADES[i] for i in shades[row]), "level")
    for order in data.orders:
        for column in {frame.column(order.low_hz), frame.column(order.high_hz)}:
            if column is None:
                continue
            for row in np.flatnonzero(shades[:, column - frame.left] == 0).tolist():
                canvas.write(frame.top + row, column, ORDER, "order")
    if frame.top:
        write_band_row(canvas, frame, 0, data.orders)
    if frame.left:
        _write_times(canvas, data, frame, row_of)
    if at is not None:
        _write_cursor(canvas, frame, row_of, at)
    if frame.bottom < canvas.rows:
        _write_hertz(canvas, frame)


def shaded(data: WaterfallData, frame: Frame, depth_db: float) -> NDArray[np.intp]:
    """(rows, columns) number of the shade: highest level in each cell, by decibels."""
    first = rows_of_times(len(data.rms), frame.rows)
    times = np.stack(
        [
            data.rms[min(a, len(data.rms) - 1) : max(b, a + 1)].max(axis=0)
            for a, b in pairwise(first.tolist())
        ]
    )
    count = len(data.frequency_hz)
    edges = np.linspace(0, count, frame.columns + 1)
    start = np.minimum(edges[:-1].astype(int), count - 1)
    end = np.maximum(np.ceil(edges[1:]).astype(int), start + 1)
    cells = np.stack([times[:, a:b].max(axis=1) for a, b in zip(start, end, strict=True)], axis=1)
    largest = float(data.rms.max(initial=0.0)) or 1.0
    with np.errstate(divide="ignore"):
        share = 1 + 20 * np.log10(cells / largest) / depth_db
    return np.clip(np.ceil(share * (len(SHADES) - 1)), 0, len(SHADES) - 1).astype(np.intp)


def _write_times(
    canvas: Canvas, data: WaterfallData, frame: Frame, first: NDArray[np.intp]
) -> None:
    every = max(1, frame.rows // 6)
    for row in range(frame.rows):
        canvas.write(frame.top + row, frame.left - 1, "┤" if row % every == 0 else "│", "axis")
        if row % every == 0:
            text = data.time_text[min(first[row], len(data.time_text) - 1)]
            canvas.write(frame.top + row, max(0, frame.left - 1 - len(text)), text, "axis")


def _write_cursor(
    canvas: Canvas, frame: Frame, first: NDArray[np.intp], at: tuple[int, float]
) -> None:
    row = int(np.searchsorted(first[1:], at[0], side="right"))
    row = frame.top + min(row, frame.rows - 1)
    canvas.write(row, max(0, frame.left - 1), "▶", "cursor")
    column = frame.column(at[1])
    if column is not None:
        canvas.write(row, column, "X", "cursor")


def _write_hertz(canvas: Canvas, frame: Frame) -> None:
    ticks = frame.axis.ticks(max(2, frame.columns // 9))
    places = [
        (column, text)
        for tick, text in zip(ticks, tick_labels(ticks), strict=True)
        if (column := frame.column(float(tick))) is not None
    ]
    canvas.write(canvas.rows - 1, canvas.columns - 2, "Hz", "axis")
    write_ticks(canvas, canvas.rows - 1, places, "axis", first=frame.left, end=canvas.columns - 3)
