"""Draw excitation bands: a hatched margin, the excitation itself darker, and a row of names."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from rich.cells import cell_len

from fieldkit.ui.widgets.frame import Frame
from fieldkit.ui.widgets.raster import Canvas

MARGIN, EXCITATION = "╱", "▒"
INKS = ("band", "margin", "band-name")


@dataclass(frozen=True)
class BandShade:
    """An excitation and the wider band to keep clear of."""

    low_hz: float
    high_hz: float
    avoid_low_hz: float
    avoid_high_hz: float
    label: str = ""

    def avoids(self, frequency_hz: float) -> bool:
        """Whether a frequency lies inside the band to keep clear of."""
        return self.avoid_low_hz <= frequency_hz <= self.avoid_high_hz


def shade_bands(canvas: Canvas, frame: Frame, bands: Sequence[BandShade]) -> None:
    """Hatch the margins of all bands, then the excitations over them."""
    for band in bands:
        avoid = frame.stretch(band.avoid_low_hz, band.avoid_high_hz)
        canvas.pattern(frame.height, avoid, MARGIN, "margin", "margin")
    for band in bands:
        inner = frame.stretch(band.low_hz, band.high_hz)
        canvas.pattern(frame.height, inner, EXCITATION, "band", "band")


def write_band_row(canvas: Canvas, frame: Frame, row: int, bands: Sequence[BandShade]) -> None:
    """One row that names the bands: a line as long as each, a block at the excitation."""
    cells = [" "] * canvas.columns
    for band in bands:
        _fill(cells, frame.stretch(band.avoid_low_hz, band.avoid_high_hz), "─")
    for band in bands:
        _fill(cells, frame.stretch(band.low_hz, band.high_hz), "█")
    for band in bands:
        _place_name(cells, frame, band)
    for column, cell in enumerate(cells):
        if cell != " ":
            canvas.write(row, column, cell, "band-name")


def _fill(cells: list[str], columns: slice, glyph: str) -> None:
    cells[columns] = glyph * (columns.stop - columns.start)


def _place_name(cells: list[str], frame: Frame, band: BandShade) -> None:
    """Beside the excitation, else beside the band; the last word alone where all is too long."""
    inner = frame.stretch(band.low_hz, band.high_hz)
    avoid = frame.stretch(band.avoid_low_hz, band.avoid_high_hz)
    if avoid.start == avoid.stop:
        return
    for name in dict.fromkeys((band.label, band.label.split()[-1] if band.label else "")):
        name = "".join(c for c in name if c.isprintable() and cell_len(c) == 1)
        starts = [inner.stop, inner.start - len(name), avoid.stop + 1, avoid.start - len(name) - 1]
        for start in starts:
            if name and _is_free(cells, start, start + len(name), frame):
                cells[start : start + len(name)] = name
                return


def _is_free(cells: Sequence[str], start: int, end: int, frame: Frame) -> bool:
    """No block or name under it, and none but its own block touching it."""
    if start < frame.left or end > frame.right:
        return False
    beside = {cells[c] for c in (start - 1, end) if frame.left <= c < frame.right}
    return set(cells[start:end]) <= {" ", "─"} and beside <= {" ", "─", "█"}
