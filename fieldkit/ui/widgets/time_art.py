"""Draw a recording: the envelope of its samples, labels of its taps, seconds below."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from fieldkit.ui.widgets.frame import Frame
from fieldkit.ui.widgets.labels import Label, write_labels, write_ticks
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.ticks import amount_text, tick_labels
from fieldkit.ui.widgets.view_range import Axis

Floats = NDArray[np.float64]
BLOCK = 256
"""Samples that share one entry of the overview, from which long stretches are drawn."""


@dataclass(frozen=True)
class TapMark:
    """One blow; ``word`` says in a word or two why it is refused."""

    number: int
    at_s: float
    usable: bool = True
    word: str = ""


@dataclass(frozen=True)
class DecayLine:
    """The envelope of one mode over one tap."""

    start_s: float
    end_s: float
    height: float
    """At its start."""
    decay_per_s: float
    word: str = ""
    """Which mode, for the read-out."""


@dataclass(frozen=True)
class Trace:
    """One channel of a recording with its taps."""

    samples: Floats
    """(n,) finite or NaN."""
    rate_hz: float
    taps: tuple[TapMark, ...] = ()
    unit: str = ""
    decays: tuple[DecayLine, ...] = ()

    @classmethod
    def of(
        cls,
        samples: Floats,
        rate_hz: float,
        taps: Sequence[TapMark] = (),
        unit: str = "",
        decays: Sequence[DecayLine] = (),
    ) -> Trace:
        """A trace whose rate makes sense."""
        return cls(samples, rate_hz if rate_hz > 0 else 1.0, tuple(taps), unit, tuple(decays))

    @property
    def duration_s(self) -> float:
        """Length in time."""
        return len(self.samples) / self.rate_hz

    @cached_property
    def overview(self) -> tuple[Floats, Floats]:
        """Lowest and highest of each block of samples."""
        if len(self.samples) == 0:
            return self.samples, self.samples
        starts = np.arange(0, len(self.samples), BLOCK)
        return np.fmin.reduceat(self.samples, starts), np.fmax.reduceat(self.samples, starts)

    @cached_property
    def largest(self) -> float:
        """Largest absolute sample; 1 where there is none above zero."""
        low, high = self.overview
        extremes = np.abs(np.concatenate([low, high]))
        largest = float(extremes[np.isfinite(extremes)].max(initial=0.0))
        return largest if largest > 0 else 1.0

    def largest_between(self, edges_s: Floats) -> float:
        """Largest absolute sample of a stretch; of all where it is empty or still."""
        extremes = np.abs(np.concatenate(self.between(edges_s)))
        largest = float(extremes[np.isfinite(extremes)].max(initial=0.0))
        return largest if largest > 0 else self.largest

    def between(self, edges_s: Floats) -> tuple[Floats, Floats]:
        """Lowest and highest sample between neighbouring times; NaN where there is none.

        Samples are held until the next one, so that no column inside the recording is empty.
        """
        at = edges_s * self.rate_hz
        if len(at) > 1 and at[1] - at[0] > 4 * BLOCK:
            low, high = self.overview
            return _lowest(low, at / BLOCK), -_lowest(-high, at / BLOCK)
        return _lowest(self.samples, at), -_lowest(-self.samples, at)


def _lowest(values: Floats, at: Floats) -> Floats:
    """Lowest of the values held by each stretch between neighbouring (fractional) indexes."""
    count = len(values)
    found = np.full(len(at) - 1, np.nan)
    first = np.floor(at[:-1]).astype(int)
    end = np.maximum(first + 1, np.ceil(at[1:] - 1e-9).astype(int))
    held = np.flatnonzero((first >= 0) & (first < count))
    if len(held):
        pairs = np.column_stack([first[held], np.minimum(end[held], count)]).ravel()
        padded = np.append(values[: pairs.max()], np.nan)
        found[held] = np.fmin.reduceat(padded, pairs)[::2]
    return found


def trace_frame(trace: Trace, axis: Axis, columns: int, rows: int) -> Frame:
    """Give each part its rows: the smaller the canvas, the fewer the parts."""
    gutter = 8 if columns >= 40 else 0
    below = 2 if rows >= 7 else 1 if rows >= 3 else 0
    top = _label_rows(trace, rows) + (1 if rows >= 7 else 0)
    return Frame(gutter, columns, top, max(top, rows - below), axis)


def _label_rows(trace: Trace, rows: int) -> int:
    return min(2 if rows >= 12 else 1, len(trace.taps)) if rows >= 5 else 0


def draw_trace(canvas: Canvas, trace: Trace, axis: Axis, cursor_s: float | None) -> None:
    """Draw everything; on the smallest canvas only the signal is left."""
    frame = trace_frame(trace, axis, canvas.columns, canvas.rows)
    if not frame.columns or not frame.rows:
        return
    _draw_marks(canvas, trace, frame, cursor_s)
    _draw_signal(canvas, trace, frame)
    _draw_axes(canvas, trace, frame)
    if canvas.rows >= 7:
        canvas.write(0, 0, readout(trace, cursor_s), "readout")


def _draw_signal(canvas: Canvas, trace: Trace, frame: Frame) -> None:
    low, high = trace.between(frame.edges)
    largest = trace.largest_between(frame.edges)
    half = (4 * frame.rows - 1) / 2
    middle = 4 * frame.top + half
    top, bottom = middle - half * high / largest, middle - half * low / largest
    canvas.columns_filled(2 * frame.left, top, bottom, "signal")
    times = frame.axis.value((np.arange(2 * frame.columns) + 0.5) / (2 * frame.columns))
    for decay in trace.decays:
        with np.errstate(over="ignore"):
            line = decay.height * np.exp(-decay.decay_per_s * (times - decay.start_s))
        line = np.minimum(line, largest)
        line[(times < decay.start_s) | (times > decay.end_s)] = np.nan
        for side in (line, -line):
            canvas.polyline(
                2 * frame.left + np.arange(len(times)),
                middle - half * side / largest,
                "decay",
                dash=3,
            )


def _draw_marks(canvas: Canvas, trace: Trace, frame: Frame, cursor_s: float | None) -> None:
    labels = []
    for tap in trace.taps:
        column = frame.column(tap.at_s)
        if column is None:
            continue
        ink = "usable" if tap.usable else "refused"
        canvas.pattern(frame.height, slice(column, column + 1), "┊", ink)
        wordings = (f"{tap.number} {tap.word}", f"{tap.number}") if tap.word else (f"{tap.number}",)
        labels.append(Label(column, "▼" if tap.usable else "×", wordings, ink))
    rows = range(frame.top - 1, frame.top - 1 - _label_rows(trace, canvas.rows), -1)
    write_labels(canvas, labels, rows)
    column = frame.column(cursor_s) if cursor_s is not None else None
    if column is not None:
        canvas.pattern(frame.height, slice(column, column + 1), "│", "cursor")


def _draw_axes(canvas: Canvas, trace: Trace, frame: Frame) -> None:
    if frame.left:
        _draw_amplitudes(canvas, trace, frame)
    below = canvas.rows - frame.bottom
    if not below:
        return
    ticks = frame.axis.ticks(max(2, frame.columns // 10))
    places = []
    if below > 1:
        canvas.write(frame.bottom, frame.left - 1, "└", "axis")
        rule_row = slice(frame.bottom, frame.bottom + 1)
        canvas.rule(rule_row, slice(frame.left, frame.right), "─", "axis")
    for tick, text in zip(ticks, tick_labels(ticks), strict=True):
        column = frame.column(float(tick))
        if column is not None:
            places.append((column, text))
            if below > 1:
                canvas.write(frame.bottom, column, "┴", "axis")
    canvas.write(canvas.rows - 1, canvas.columns - 1, "s", "axis")
    write_ticks(canvas, canvas.rows - 1, places, "axis", first=frame.left, end=canvas.columns - 2)


def _draw_amplitudes(canvas: Canvas, trace: Trace, frame: Frame) -> None:
    line = frame.left - 1
    canvas.rule(frame.height, slice(line, line + 1), "│", "axis")
    largest = trace.largest_between(frame.edges)
    numbers = {frame.bottom - 1: -largest, frame.top: largest}
    if frame.rows >= 5:
        numbers[(frame.top + frame.bottom - 1) // 2] = 0.0
    for row, value in numbers.items():
        text = f"{value:.2g}".replace("-", "−")
        canvas.write(row, line, "┤", "axis")
        canvas.write(row, max(0, line - len(text)), text[:line], "axis")
    if trace.unit:
        canvas.write(frame.top - 1, 0, trace.unit[: frame.left], "axis")


def readout(trace: Trace, cursor_s: float | None) -> str:
    """How many taps are usable, or what the cursor stands on."""
    if cursor_s is None:
        usable = sum(tap.usable for tap in trace.taps)
        words = f"{usable} of {len(trace.taps)} taps usable, {trace.duration_s:.1f} s"
        return f"{words}  ╌╌ {trace.decays[0].word}" if trace.decays else words
    for tap in trace.taps:
        if tap.at_s == cursor_s:
            verdict = "usable" if tap.usable else f"not usable: {tap.word}"
            return f"│ tap {tap.number} at {tap.at_s:.3f} s, {verdict}"
    index = min(len(trace.samples) - 1, max(0, int(cursor_s * trace.rate_hz)))
    return f"│ {cursor_s:.3f} s  {amount_text(float(trace.samples[index]), trace.unit)}"
