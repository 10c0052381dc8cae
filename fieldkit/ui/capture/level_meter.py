"""Level of a channel as one line: bar, peak hold, threshold of the trigger, clip lamp."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from textual.content import Content

from fieldkit.capture.meter import ChannelLevel, decibels
from fieldkit.ui.words import safe

LEAST_DB = -60.0
_LABEL, _FIGURES = 13, 21
_SHORT_LABEL, _SHORT_FIGURES = 8, 13
LEAST_BAR = 10
SHORT_METERS, MOST_METERS = 2, 8
"""Rows there are for them on a short screen, and on others."""


def meter_line(
    level: ChannelLevel,
    label: str,
    width: int,
    threshold: float | None = None,
    *,
    short: bool = False,
) -> Content:
    """A line of so many cells; ``threshold`` (full scale 1) is drawn where the channel has one."""
    named, figured = (_SHORT_LABEL, _SHORT_FIGURES) if short else (_LABEL, _FIGURES)
    cells = max(width - named - figured, LEAST_BAR)
    bar = ["█"] * _cell(level.peak, cells)
    bar += ["·"] * (cells - len(bar))
    for share, glyph in ((threshold, "┊"), (level.held, "┃")):
        if share is not None and share > 0:
            bar[min(max(_cell(share, cells) - 1, 0), cells - 1)] = glyph
    held_db = decibels(level.held, LEAST_DB)
    figures = f" {held_db:3.0f} " if short else f" {held_db:4.0f} dB "
    name = Content(safe(label)[: named - 1].ljust(named))
    return name + Content(f"▕{''.join(bar)}▏{figures}") + _lamp(level, short=short)


def meters(
    levels: Sequence[ChannelLevel],
    labels: Sequence[str],
    width: int,
    thresholds: Mapping[int, float],
    *,
    rows: int,
) -> Content:
    """All channels; two beside each other where there are more of them than rows."""
    if len(levels) <= rows:
        lines = [
            meter_line(level, labels[i], width, thresholds.get(i)) for i, level in enumerate(levels)
        ]
        return Content("\n").join(lines)
    cells = [
        meter_line(level, labels[i], width // 2, thresholds.get(i), short=True)
        for i, level in enumerate(levels)
    ]
    return Content("\n").join([Content("").join(cells[i : i + 2]) for i in range(0, len(cells), 2)])


def _lamp(level: ChannelLevel, *, short: bool) -> Content:
    """Lit for two seconds, then it remembers that it was."""
    if level.clipped:
        return Content.styled(" CLIP " if short else " CLIPPED ", "bold reverse")
    if short:
        return Content(" clip " if level.clipped_samples else "      ")
    return Content(" clip seen" if level.clipped_samples else "")


def _cell(share: float, cells: int) -> int:
    """How many cells of the bar a share of full scale fills."""
    return round(cells * (1 - decibels(share, LEAST_DB) / LEAST_DB))
