"""Draw a spectrum on a canvas: rows of labels, the plot, its axes."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from rich.cells import cell_len

from fieldkit.ui.widgets.band_art import shade_bands, write_band_row
from fieldkit.ui.widgets.dots import envelope
from fieldkit.ui.widgets.frame import Frame
from fieldkit.ui.widgets.labels import Label, write_labels, write_ticks
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.spectrum_data import Mark, SpectrumData, highest_between
from fieldkit.ui.widgets.ticks import (
    amount_text,
    frequency_text,
    round_down,
    round_up,
    tick_labels,
    tick_step,
)
from fieldkit.ui.widgets.view_range import Axis

Floats = NDArray[np.float64]
GLYPHS = {"mode": "▼", "tone": "≈", "refused": "×", "model": "△"}
DASHES = {"second": 6, "background": 1, "model": 3}
SAMPLES = {"second": "╌╌", "background": "··", "model": "╌ "}
KEYS = "←→ pan  +− zoom  ,. cursor  [] marks  l f scales"
LETTER_STEP = 24
"""Columns between two letters of one curve."""
LEAST_GUTTER, MOST_GUTTER = 5, 9
DEEPEST = 1e-6
"""Of the largest value: below it a logarithmic axis shows nothing unless moved there."""


@dataclass(frozen=True)
class View:
    """Which part of the data is shown, and how."""

    frequency: Axis
    amplitude_log: bool = True
    lift: float = 0.0
    """Shift of the amplitude axis, in shares of its length."""
    cursor_hz: float | None = None
    focused: bool = False


def plot_frame(data: SpectrumData, view: View, columns: int, rows: int) -> Frame:
    """Give each part its rows: the smaller the canvas, the fewer the parts."""
    gutter = min(MOST_GUTTER, max(LEAST_GUTTER, len(data.amplitude_unit))) + 1
    if columns < 5 * gutter:
        gutter = 0
    axis = 2 if rows >= 6 else 1 if rows >= 3 else 0
    top = _readout_rows(rows) + _label_rows(data, rows) + _band_rows(data, rows)
    return Frame(min(gutter, columns), columns, top, max(top, rows - axis), view.frequency)


def _readout_rows(rows: int) -> int:
    return 1 if rows >= 7 else 0


def _label_rows(data: SpectrumData, rows: int) -> int:
    return min(len(data.marks), 3, max(0, (rows - 5) // 4))


def _band_rows(data: SpectrumData, rows: int) -> int:
    return 1 if data.bands and rows >= 8 else 0


def draw_spectrum(canvas: Canvas, data: SpectrumData, view: View) -> None:
    """Draw everything; on the smallest canvas only the curves are left."""
    frame = plot_frame(data, view, canvas.columns, canvas.rows)
    if not frame.rows or not frame.columns:
        return
    reduced = [envelope(c.frequency_hz, c.amplitude, frame.edges) for c in data.curves]
    amplitude = amplitude_axis(reduced, view)
    _draw_bands(canvas, data, frame)
    _draw_marks(canvas, data, frame)
    _draw_cursor(canvas, view, frame)
    for curve, (low, high) in zip(data.curves, reduced, strict=True):
        _draw_curve(canvas, frame, amplitude, low, high, curve.role)
    _write_letters(canvas, data, frame, amplitude, [high for _, high in reduced])
    _draw_axes(canvas, data, frame, amplitude)
    if _readout_rows(canvas.rows):
        _write_head(canvas, data, view, frame)


def _write_head(canvas: Canvas, data: SpectrumData, view: View, frame: Frame) -> None:
    """The read-out before the legend, the legend before the keys."""
    words = readout(data, view, frame)
    start = canvas.write(0, 0, words, "readout")
    legend_start = _write_legend(canvas, data, start + 2 if words else 0)
    if view.focused and not words and len(KEYS) + 2 <= legend_start:
        canvas.write(0, 0, KEYS, "axis")


def amplitude_axis(reduced: Sequence[tuple[Floats, Floats]], view: View) -> Axis:
    """From below the noise to above the highest peak in view, ends on round values."""
    highs = np.concatenate([high for _, high in reduced] or [np.empty(0)])
    highs = highs[np.isfinite(highs)]
    top = float(highs.max(initial=0.0))
    if top <= 0:
        return Axis(0.1, 1.0, log=True) if view.amplitude_log else Axis(0.0, 1.0)
    if not view.amplitude_log:
        step = tick_step(top, 4)
        return Axis(0.0, step * math.ceil(top / step * 1.02)).panned(view.lift)
    lows = np.concatenate([low for low, _ in reduced])
    lows = lows[np.isfinite(lows) & (lows > 0)]
    floor = float(np.percentile(lows, 5)) if len(lows) else top / 100
    floor = min(max(floor, DEEPEST * top), top / 20)
    return Axis(round_down(floor), round_up(1.2 * top), log=True).panned(view.lift)


def _draw_curve(
    canvas: Canvas, frame: Frame, amplitude: Axis, low: Floats, high: Floats, role: str
) -> None:
    height = 4 * frame.rows - 1
    first = 4 * frame.top
    top = first + height * (1 - np.clip(amplitude.share(high), -1.0, 1.0))
    bottom = first + height * (1 - np.clip(amplitude.share(low), 0.0, 2.0))
    top = np.where(top > first + height + 0.5, np.nan, top)
    ink = role if role in DASHES else "measured"
    canvas.columns_filled(
        2 * frame.left, top, np.minimum(bottom, first + height), ink, dash=DASHES.get(role, 0)
    )


def _write_letters(
    canvas: Canvas, data: SpectrumData, frame: Frame, amplitude: Axis, highs: Sequence[Floats]
) -> None:
    """Each curve's letter on its line here and there, staggered so that they keep apart."""
    lettered = [(c, high) for c, high in zip(data.curves, highs, strict=True) if c.letter]
    for number, (curve, high) in enumerate(lettered):
        ink = curve.role if curve.role in DASHES else "measured"
        first = LETTER_STEP * (number + 1) // (len(lettered) + 1)
        for column in range(first, frame.columns, LETTER_STEP):
            share = float(amplitude.share(high[2 * column]))
            if math.isfinite(share) and 0 <= share <= 1:
                row = frame.bottom - 1 - round(share * (frame.rows - 1))
                canvas.write(row, frame.left + column, curve.letter, ink)


def _draw_bands(canvas: Canvas, data: SpectrumData, frame: Frame) -> None:
    shade_bands(canvas, frame, data.bands)
    if _band_rows(data, canvas.rows):
        write_band_row(canvas, frame, frame.top - 1, data.bands)


def _draw_marks(canvas: Canvas, data: SpectrumData, frame: Frame) -> None:
    above = [m for m in data.marks if m.kind != "model"]
    below = [m for m in data.marks if m.kind == "model"]
    for mark in data.marks:
        column = frame.column(mark.frequency_hz)
        if column is not None:
            canvas.pattern(frame.height, slice(column, column + 1), "┊", mark.kind)
    lowest = frame.top - _band_rows(data, canvas.rows) - 1
    rows = range(lowest, lowest - _label_rows(data, canvas.rows), -1)
    write_labels(canvas, _labels(above, frame), rows or [frame.top])
    write_labels(canvas, _labels(below, frame), [frame.bottom - 1])


def _labels(marks: Sequence[Mark], frame: Frame) -> list[Label]:
    """Modes first; where room is short, whichever comes first in the data is written."""
    order = ("mode", "model", "tone", "refused")
    labels = []
    for mark in sorted(marks, key=lambda m: order.index(m.kind)):
        column = frame.column(mark.frequency_hz)
        if column is not None:
            number = frequency_text(mark.frequency_hz)
            wordings = (f"{number} {mark.label}", number) if mark.label else (number,)
            labels.append(Label(column, GLYPHS[mark.kind], wordings, mark.kind))
    return labels


def _draw_cursor(canvas: Canvas, view: View, frame: Frame) -> None:
    column = frame.column(view.cursor_hz) if view.cursor_hz is not None else None
    if column is not None:
        canvas.pattern(frame.height, slice(column, column + 1), "│", "cursor")


def _draw_axes(canvas: Canvas, data: SpectrumData, frame: Frame, amplitude: Axis) -> None:
    if frame.left:
        _draw_amplitude_axis(canvas, data, frame, amplitude)
    below = canvas.rows - frame.bottom
    if below:
        _draw_frequency_axis(canvas, frame, line=below > 1)


def _draw_amplitude_axis(canvas: Canvas, data: SpectrumData, frame: Frame, amplitude: Axis) -> None:
    line = frame.left - 1
    canvas.rule(frame.height, slice(line, line + 1), "│", "axis")
    ticks = amplitude.ticks(max(2, frame.rows // 2))
    taken: set[int] = set()
    for tick, text in zip(ticks, tick_labels(ticks), strict=True):
        share = float(amplitude.share(tick))
        row = frame.bottom - 1 - round(share * (frame.rows - 1))
        if frame.top <= row < frame.bottom and row not in taken:
            taken.add(row)
            canvas.write(row, line, "┤", "axis")
            canvas.write(row, max(0, line - len(text)), text[:line], "axis")
    if frame.top > _readout_rows(canvas.rows):
        canvas.write(frame.top - 1, 0, data.amplitude_unit[: frame.left], "axis")


def _draw_frequency_axis(canvas: Canvas, frame: Frame, *, line: bool) -> None:
    row = frame.bottom
    if line:
        canvas.rule(slice(row, row + 1), slice(frame.left, frame.right), "─", "axis")
        canvas.write(row, frame.left - 1, "└", "axis")
    ticks = frame.axis.ticks(max(2, frame.columns // 9))
    places = []
    for tick, text in zip(ticks, tick_labels(ticks), strict=True):
        column = frame.column(float(tick))
        if column is not None:
            places.append((column, text))
            if line:
                canvas.write(row, column, "┴", "axis")
    last = canvas.rows - 1
    canvas.write(last, canvas.columns - 2, "Hz", "axis")
    write_ticks(canvas, last, places, "axis", first=frame.left, end=canvas.columns - 3)


def readout(data: SpectrumData, view: View, frame: Frame) -> str:
    """What the cursor stands on; empty without a cursor."""
    cursor = view.cursor_hz
    if cursor is None:
        return ""
    reading = read_cursor(data, view, frame)
    words = f"│ {frequency_text(cursor)} Hz"
    if reading is not None:
        words = f"│ {reading[0]:.4g} Hz  {amount_text(reading[1], data.amplitude_unit)}"
    column = frame.column(cursor)
    under = [m for m in data.marks if frame.column(m.frequency_hz) == column is not None]
    for mark in sorted(under, key=lambda m: abs(m.frequency_hz - cursor))[:1]:
        number = frequency_text(mark.frequency_hz)
        words += f"  {GLYPHS[mark.kind]}{number} {mark.label or mark.kind}"
    inside = [band.label for band in data.bands if band.avoids(cursor)]
    return f"{words}  in {', '.join(inside)}" if inside else words


def read_cursor(data: SpectrumData, view: View, frame: Frame) -> tuple[float, float] | None:
    """(frequency_hz, amplitude) of the highest line under the cursor's dot column."""
    if view.cursor_hz is None or not data.curves or not frame.columns:
        return None
    half = 0.5 / (2 * frame.columns)
    share = float(view.frequency.share(view.cursor_hz))
    low, high = view.frequency.value([share - half, share + half])
    return highest_between(data.curves[0], float(low), float(high))


def _write_legend(canvas: Canvas, data: SpectrumData, from_column: int) -> int:
    """Names of the curves at the right end, where there is room; returns where they start."""
    entries = [
        (c.letter or SAMPLES.get(c.role, "──"), c.label, c.role) for c in data.curves if c.label
    ]
    width = sum(cell_len(sample) + cell_len(label) + 3 for sample, label, _ in entries) - 2
    start = canvas.columns - max(0, width)
    if start < from_column:
        return canvas.columns
    column = start
    for sample, label, role in entries:
        ink = role if role in DASHES else "measured"
        column = canvas.write(0, column, sample, ink)
        column = canvas.write(0, column + 1, label, "axis") + 2
    return start
