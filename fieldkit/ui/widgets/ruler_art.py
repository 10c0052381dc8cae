"""Draw the frequency ruler: bands, measured modes, modes now and after, on one axis."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from fieldkit.detune.excitation import Band
from fieldkit.ui.widgets.band_art import BandShade, shade_bands, write_band_row
from fieldkit.ui.widgets.frame import Frame
from fieldkit.ui.widgets.labels import write_ticks
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.ticks import frequency_text, tick_labels
from fieldkit.ui.widgets.view_range import Axis

Spread = tuple[float, float, float]
"""Low, median and high of one frequency."""


@dataclass(frozen=True)
class RulerData:
    """What the ruler shows; frequencies with their doubt are (low, median, high)."""

    up_to_hz: float
    bands: Sequence[Band | BandShade] = ()
    measured_hz: Sequence[float] = ()
    now: Sequence[float | Spread] = ()
    after: Sequence[float | Spread] = ()
    names: tuple[str, str, str] = ("measured", "now", "after")
    """What the three rows are called."""

    @property
    def shades(self) -> tuple[BandShade, ...]:
        """Its bands, ready to draw."""
        return tuple(
            band
            if isinstance(band, BandShade)
            else BandShade(
                band.low_hz, band.high_hz, band.avoid_low_hz, band.avoid_high_hz, band.name
            )
            for band in self.bands
        )


@dataclass(frozen=True)
class Row:
    """One row of modes; the glyph tells clear of the bands, touching one, and inside."""

    ink: str
    clear: str
    touching: str
    inside: str
    absent: str


ROWS = (
    Row("measured", "◇", "◈", "◆", "nothing measured yet"),
    Row("now", "○", "◐", "●", "not computed yet"),
    Row("after", "△", "◭", "▲", "no change chosen"),
)
GUTTER = 9
KEPT = {1: (1,), 2: (1,), 3: (1, 2)}
"""Which rows are left where the height is small."""


def draw_ruler(canvas: Canvas, data: RulerData) -> None:
    """Draw as many rows as there is height for; the row of band names goes first."""
    gutter = GUTTER if canvas.columns >= 40 else 2 if canvas.columns >= 12 else 0
    names = 1 if canvas.rows >= 5 else 0
    numbers = 1 if canvas.rows >= 2 else 0
    axis = Axis(0.0, data.up_to_hz if data.up_to_hz > 0 else 1.0)
    frame = Frame(gutter, canvas.columns, names, max(names, canvas.rows - numbers), axis)
    if not frame.columns or not frame.rows:
        return
    shade_bands(canvas, frame, data.shades)
    if names:
        canvas.write(0, 0, "keep out"[:gutter], "name")
        write_band_row(canvas, frame, 0, data.shades)
    kept = KEPT.get(canvas.rows, (0, 1, 2))
    for index, row in enumerate(kept, start=names):
        spreads = [_spread(value) for value in (data.measured_hz, data.now, data.after)[row]]
        canvas.write(index, 0, data.names[row][: max(0, gutter - 1)], "name")
        _draw_row(canvas, frame, index, ROWS[row], spreads, data.shades)
    if numbers:
        _draw_axis(canvas, frame)


def _spread(value: float | Spread) -> Spread:
    return value if isinstance(value, tuple) else (value, value, value)


def _draw_row(
    canvas: Canvas,
    frame: Frame,
    row: int,
    look: Row,
    spreads: Sequence[Spread],
    bands: Sequence[BandShade],
) -> None:
    if not spreads:
        canvas.write(row, frame.left + 1, look.absent, "name")
        return
    for low, _, high in spreads:
        bar = frame.stretch(low, high)
        if bar.stop - bar.start > 1:
            canvas.write(row, bar.start, "━" * (bar.stop - bar.start), look.ink)
    glyphs = [(frame.column(s[1]), *_look_of(s, look, bands), s) for s in spreads]
    for column, glyph, ink, _ in glyphs:
        if column is not None:
            canvas.write(row, column, glyph, ink)
    for column, _, ink, spread in glyphs:
        if column is not None:
            _write_number(canvas, frame, row, spread, ink)
    _tell_above(canvas, frame, row, sum(s[1] > frame.axis.high for s in spreads))


def _look_of(spread: Spread, look: Row, bands: Sequence[BandShade]) -> tuple[str, str]:
    low, median, high = spread
    if any(band.avoids(median) for band in bands):
        return look.inside, "hit"
    if any(low <= band.avoid_high_hz and high >= band.avoid_low_hz for band in bands):
        return look.touching, "touch"
    return look.clear, look.ink


def _write_number(canvas: Canvas, frame: Frame, row: int, spread: Spread, ink: str) -> None:
    bar = frame.stretch(spread[0], spread[2])
    text = frequency_text(spread[1])
    for start in (bar.stop, bar.start - len(text)):
        if start >= frame.left and canvas.free(row, start, start + len(text)):
            canvas.write(row, start, text, ink)
            return


def _tell_above(canvas: Canvas, frame: Frame, row: int, count: int) -> None:
    text = f"{count}▸"
    start = frame.right - len(text)
    if count and canvas.free(row, start, frame.right):
        canvas.write(row, start, text, "name")


def _draw_axis(canvas: Canvas, frame: Frame) -> None:
    row = canvas.rows - 1
    ticks = frame.axis.ticks(max(2, frame.columns // 9))
    places = [
        (column, text)
        for tick, text in zip(ticks, tick_labels(ticks), strict=True)
        if (column := frame.column(float(tick))) is not None
    ]
    canvas.write(row, frame.left - 3, "Hz", "axis")
    write_ticks(canvas, row, places, "axis", first=frame.left, end=frame.right)
