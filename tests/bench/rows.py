"""What a benchmark found: rows of one table, and the exponent of a growth."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

BY_CLOCK = "by the clock"
"""Ends the unit of a time that other work on the machine lengthens."""
HEAD = ("benchmark", "what", "fieldkit", "beside it", "unit", "ratio", "beside what")
FLAT = 0.05
"""Below this exponent a cost does not grow, and nothing can be stated as a ratio to it."""
_BUSY = "the machine was busy"


@dataclass(frozen=True)
class Row:
    """One figure beside the same of what one would otherwise do, both from one run."""

    name: str
    ours: float
    """Median."""
    theirs: float
    """Median."""
    ratio: float
    """Ours over theirs, the median of pairs measured one after the other where there are such."""
    against: str
    unit: str
    note: str = ""


@dataclass(frozen=True)
class Growth:
    """Costs at several sizes, each beside those of something else."""

    name: str
    sizes: Sequence[float]
    size: str
    """What is counted, such as ``supports``."""
    ours: Sequence[float]
    theirs: Sequence[float]
    against: str
    unit: str
    note: str = ""

    def rows(self) -> list[Row]:
        """One for each size, then the exponents over all sizes and between the two largest.

        The ratio of exponents is NaN where the cost beside it does not grow.
        """
        each = [
            Row(f"{self.name}: {size:,.0f} {self.size}", a, b, a / b, self.against, self.unit)
            for size, a, b in zip(self.sizes, self.ours, self.theirs, strict=True)
        ]
        return [*each, self._exponents()]

    def _exponents(self) -> Row:
        ours, theirs = exponent(self.sizes, self.ours), exponent(self.sizes, self.theirs)
        last = exponent(self.sizes[-2:], self.ours[-2:])
        note = f"{last:.2f} between the two largest" + (f"; {self.note}" if self.note else "")
        name = f"{self.name}: grows as {self.size} to the power of"
        ratio = ours / theirs if abs(theirs) > FLAT else np.nan
        return Row(name, ours, theirs, ratio, self.against, "exponent", note)


def exponent(sizes: Sequence[float], values: Sequence[float]) -> float:
    """Slope of log value over log size by least squares: values grow as size to this power.

    Raises ValueError where fewer than two sizes differ, or one number is not positive.
    """
    size, value = np.asarray(sizes, float), np.asarray(values, float)
    if len(np.unique(size)) < 2 or np.any(size <= 0) or np.any(value <= 0):
        raise ValueError("an exponent needs two different sizes, and positive numbers only")
    return float(np.polyfit(np.log(size), np.log(value), 1)[0])


def table(figures: Sequence[str]) -> str:
    """Lines of rows under their head."""
    return headed(HEAD, figures, right=("fieldkit", "beside it", "ratio"))


def headed(head: Sequence[str], body: Sequence[str], right: Sequence[str] = ()) -> str:
    """A Markdown table; the columns named in ``right`` are set to the right."""
    rule = ["---:" if name in right else "---" for name in head]
    return "\n".join([_line(head), _line(rule), *body])


def lines(benchmark: str, rows: Sequence[Row], *, busy: bool) -> list[str]:
    """One line of the table for each row; times by the clock of a busy machine are marked."""
    return [_row(benchmark, _marked(row) if busy else row) for row in rows]


def number(value: float) -> str:
    """Three digits, thousands set apart."""
    if not np.isfinite(value):
        return "–"
    if abs(value) >= 100:
        return f"{float(f'{value:.3g}'):,.0f}"
    return f"{value:#.3g}".rstrip(".") if value else "0"


def _marked(row: Row) -> Row:
    if not row.unit.endswith(BY_CLOCK):
        return row
    return replace(row, note="; ".join(filter(None, (row.note, _BUSY))))


def _row(benchmark: str, row: Row) -> str:
    against = f"{row.against} ({row.note})" if row.note else row.against
    values = (number(row.ours), number(row.theirs), row.unit, number(row.ratio))
    return _line((benchmark, row.name, *values, against))


def _line(cells: Sequence[str]) -> str:
    return f"| {' | '.join(cells)} |"
