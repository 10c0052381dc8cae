"""A doubt before and after, on one line: ``├──▓▓█▓──┤``."""

from __future__ import annotations

import math

Spread = tuple[float, float, float]

CELLS = 17
LOG_FROM = 1.5
"""An axis whose ends differ by a larger factor is logarithmic."""


def interval_bar(before: Spread, after: Spread, cells: int = CELLS) -> str:
    """Low, median and high before (line with ends) and after (shade, solid at the median).

    The axis holds both; it is logarithmic where both are positive and far apart.
    """
    low, high = min(before[0], after[0]), max(before[2], after[2])
    if not high > low:
        return "█".center(cells)
    scale = math.log if low > 0 and high > LOG_FROM * low else float

    def cell(value: float) -> int:
        share = (scale(value) - scale(low)) / (scale(high) - scale(low))
        return round(share * (cells - 1))

    row = [" "] * cells
    ends = cell(before[0]), cell(before[2])
    row[ends[0] : ends[1] + 1] = ["─"] * (ends[1] + 1 - ends[0])
    first, middle, last = map(cell, after)
    row[first : last + 1] = ["▓"] * (last + 1 - first)
    row[ends[0]], row[ends[1]] = "├", "┤"
    row[middle] = "█"
    return "".join(row)
