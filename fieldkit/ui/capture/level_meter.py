"""Level of a channel as one line: bar, peak hold, threshold of the trigger, clip lamp."""

from __future__ import annotations

from textual.content import Content

from fieldkit.capture.meter import ChannelLevel, decibels
from fieldkit.ui.words import safe

LEAST_DB = -60.0
_LABEL, _FIGURES = 13, 21
LEAST_BAR = 10


def meter_line(
    level: ChannelLevel, label: str, width: int, threshold: float | None = None
) -> Content:
    """A line of so many cells; ``threshold`` (full scale 1) is drawn where the channel has one."""
    cells = max(width - _LABEL - _FIGURES, LEAST_BAR)
    bar = ["█"] * _cell(level.peak, cells)
    bar += ["·"] * (cells - len(bar))
    for share, glyph in ((threshold, "┊"), (level.held, "┃")):
        if share is not None and share > 0:
            bar[min(max(_cell(share, cells) - 1, 0), cells - 1)] = glyph
    figures = f" {decibels(level.held, LEAST_DB):4.0f} dB "
    name = Content(safe(label)[: _LABEL - 1].ljust(_LABEL))
    return name + Content(f"▕{''.join(bar)}▏{figures}") + _lamp(level)


def _lamp(level: ChannelLevel) -> Content:
    """Lit for two seconds, then it remembers that it was."""
    if level.clipped:
        return Content.styled(" CLIPPED ", "bold reverse")
    return Content(" clip seen" if level.clipped_samples else "")


def _cell(share: float, cells: int) -> int:
    """How many cells of the bar a share of full scale fills."""
    return round(cells * (1 - decibels(share, LEAST_DB) / LEAST_DB))
