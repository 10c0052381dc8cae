"""Draw frequencies against one size of a change: doubts, bands, a marker and the chance."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.ui.widgets.band_art import EXCITATION, MARGIN, BandShade
from fieldkit.ui.widgets.frame import Frame
from fieldkit.ui.widgets.labels import write_ticks
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.ticks import tick_labels
from fieldkit.ui.widgets.view_range import Axis

Floats = NDArray[np.float64]
LEFT, RIGHT = 7, 5
MARKER, DRAWN = "│", "┊"
HEADROOM = 1.08


@dataclass(frozen=True)
class CurveData:
    """n values of one size with the first modes at each."""

    value: Floats
    """(n,) rising."""
    log: bool
    frequency_hz: Floats
    """(n, modes, 3) 5 %, median, 95 %; NaN where there is none."""
    shade: Sequence[str]
    """(n,) one character for the chance at each value."""
    bands: Sequence[BandShade]
    drawn: int
    up_to_hz: float
    ticks: Sequence[tuple[float, str]]
    """Values to write under the axis, and how."""

    @property
    def axis(self) -> Axis:
        """The axis of the values."""
        return Axis(float(self.value[0]), float(self.value[-1]), self.log)

    @property
    def top_hz(self) -> float:
        """Upper end: the highest mode and a band it comes near, as far as the question goes."""
        modes = self.frequency_hz[np.isfinite(self.frequency_hz)]
        highest = float(modes.max(initial=0.0))
        near = [b.avoid_high_hz for b in self.bands if b.avoid_low_hz < HEADROOM * highest]
        return min(self.up_to_hz, HEADROOM * max([highest, *near])) or 1.0


def curve_frame(data: CurveData, columns: int, rows: int) -> Frame:
    """The plot: a row for the chance above, the axis and its numbers below."""
    left, right = (LEFT, RIGHT) if columns >= 40 else (0, 0)
    top = 1 if rows >= 5 else 0
    return Frame(
        left, max(left, columns - right), top, max(top, rows - (2 if rows >= 6 else 0)), data.axis
    )


def draw_curves(canvas: Canvas, data: CurveData, at: int) -> None:
    """Draw everything; on the smallest canvas only the curves are left."""
    frame = curve_frame(data, canvas.columns, canvas.rows)
    if not frame.columns or not frame.rows:
        return
    hertz = Axis(0.0, data.top_hz)
    for band in data.bands:
        _band(canvas, frame, hertz, (band.avoid_low_hz, band.avoid_high_hz), MARGIN, "margin")
    for band in data.bands:
        _band(canvas, frame, hertz, (band.low_hz, band.high_hz), EXCITATION, "band")
    for value, glyph, ink in (
        (data.value[data.drawn], DRAWN, "drawn"),
        (data.value[at], MARKER, "cursor"),
    ):
        column = frame.column(float(value))
        if column is not None:
            canvas.pattern(frame.height, slice(column, column + 1), glyph, ink)
    for mode in range(data.frequency_hz.shape[1]):
        _draw_mode(canvas, frame, hertz, data, mode)
    _name_bands(canvas, frame, hertz, data.bands)
    if frame.left:
        _draw_hertz(canvas, frame, hertz)
        _number_modes(canvas, frame, hertz, data)
    if frame.top:
        _draw_chance(canvas, frame, data)
    if canvas.rows - frame.bottom >= 2:
        _draw_values(canvas, frame, data, at)


def rows_between(frame: Frame, hertz: Axis, low_hz: float, high_hz: float) -> slice:
    """Rows of the plot that a stretch of frequencies touches."""
    if high_hz < hertz.low or low_hz > hertz.high:
        return slice(frame.top, frame.top)
    low, high = (float(share) for share in np.clip(hertz.share([low_hz, high_hz]), 0.0, 1.0))
    first = min(frame.rows - 1, int((1 - high) * frame.rows))
    end = max(first + 1, min(frame.rows, int(np.ceil((1 - low) * frame.rows))))
    return slice(frame.top + first, frame.top + end)


def _band(
    canvas: Canvas, frame: Frame, hertz: Axis, between: tuple[float, float], glyph: str, ink: str
) -> None:
    rows = rows_between(frame, hertz, *between)
    canvas.pattern(rows, slice(frame.left, frame.right), glyph, ink, ink)


def _dots(frame: Frame, hertz: Axis, frequency_hz: Floats) -> Floats:
    """Dot rows of frequencies."""
    return 4 * frame.top + (4 * frame.rows - 1) * (1 - hertz.share(frequency_hz))


def _draw_mode(canvas: Canvas, frame: Frame, hertz: Axis, data: CurveData, mode: int) -> None:
    """The doubt as upright strokes with gaps, the median as a full line over it."""
    across = frame.axis.share(data.value)
    dots = (np.arange(2 * frame.columns) + 0.5) / (2 * frame.columns)
    low, median, high = (np.interp(dots, across, data.frequency_hz[:, mode, k]) for k in range(3))
    bottom = np.where(
        low <= hertz.high, np.minimum(_dots(frame, hertz, low), 4 * frame.bottom - 1), np.nan
    )
    top = np.maximum(_dots(frame, hertz, high), 4 * frame.top)
    canvas.columns_filled(2 * frame.left, top, bottom, "doubt", dash=1)
    seen = np.where(median <= hertz.high, _dots(frame, hertz, median), np.nan)
    canvas.polyline(2 * frame.left + np.arange(len(dots)), seen, "mode")


def _name_bands(canvas: Canvas, frame: Frame, hertz: Axis, bands: Sequence[BandShade]) -> None:
    """Each name on the middle of its excitation, at an end or between, where nothing is drawn."""
    for band in bands:
        rows = rows_between(frame, hertz, band.low_hz, band.high_hz)
        if rows.start == rows.stop or not band.label:
            continue
        row = (rows.start + rows.stop - 1) // 2
        for name in dict.fromkeys((band.label, band.label.split()[-1])):
            places = (
                frame.left + 1,
                frame.right - len(name) - 1,
                (frame.left + frame.right - len(name)) // 2,
            )
            start = next((s for s in places if canvas.blank(row, s - 1, s + len(name) + 1)), None)
            if start is not None:
                canvas.write(row, start, name, "band-name")
                break


def _draw_hertz(canvas: Canvas, frame: Frame, hertz: Axis) -> None:
    line = frame.left - 1
    canvas.rule(frame.height, slice(line, line + 1), "│", "axis")
    ticks = hertz.ticks(max(2, frame.rows // 3))
    for tick, text in zip(ticks, tick_labels(ticks), strict=True):
        row = frame.bottom - 1 - round(float(hertz.share(tick)) * (frame.rows - 1))
        if frame.top <= row < frame.bottom:
            canvas.write(row, line, "┤", "axis")
            canvas.write(row, max(0, line - len(text)), text[:line], "axis")
    if frame.bottom < canvas.rows:
        canvas.write(frame.bottom, max(0, line - 3), "Hz", "axis")


def _number_modes(canvas: Canvas, frame: Frame, hertz: Axis, data: CurveData) -> None:
    """The number of each mode where its curve ends at the right, several of one row together."""
    ends: dict[int, list[str]] = {}
    for mode in range(data.frequency_hz.shape[1]):
        last = float(data.frequency_hz[-1, mode, 1])
        if np.isfinite(last) and last <= hertz.high:
            row = min(frame.rows - 1, int((1 - float(hertz.share(last))) * frame.rows))
            ends.setdefault(frame.top + row, []).append(str(mode + 1))
    for row, numbers in ends.items():
        canvas.write(row, frame.right + 1, ",".join(numbers), "mode")


def _draw_chance(canvas: Canvas, frame: Frame, data: CurveData) -> None:
    canvas.write(0, 0, "chance"[: frame.left], "axis")
    shares = frame.axis.share(data.value)
    for column in range(frame.columns):
        i = int(np.argmin(np.abs(shares - (column + 0.5) / frame.columns)))
        canvas.write(0, frame.left + column, data.shade[i], "chance")


def _draw_values(canvas: Canvas, frame: Frame, data: CurveData, at: int) -> None:
    row = frame.bottom
    canvas.rule(slice(row, row + 1), slice(frame.left, frame.right), "─", "axis")
    places = []
    for value, text in data.ticks:
        column = frame.column(value)
        if column is not None:
            canvas.write(row, column, "┴", "axis")
            places.append((column, text))
    for value, glyph, ink in (
        (data.value[data.drawn], "△", "drawn"),
        (data.value[at], "▲", "cursor"),
    ):
        column = frame.column(float(value))
        if column is not None:
            canvas.write(row, column, glyph, ink)
    write_ticks(canvas, row + 1, places, "axis", first=frame.left, end=canvas.columns)
