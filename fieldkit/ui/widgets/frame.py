"""Where a plot lies on its canvas, and which column holds which value of its axis."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.ui.widgets.view_range import Axis


@dataclass(frozen=True)
class Frame:
    """A rectangle of cells with an axis from its left to its right edge."""

    left: int
    right: int
    top: int
    bottom: int
    axis: Axis

    @property
    def columns(self) -> int:
        """Width in cells."""
        return max(0, self.right - self.left)

    @property
    def rows(self) -> int:
        """Height in cells."""
        return max(0, self.bottom - self.top)

    @property
    def height(self) -> slice:
        """All of its rows."""
        return slice(self.top, self.bottom)

    @property
    def edges(self) -> NDArray[np.float64]:
        """(2 columns + 1,) values between which each dot column lies."""
        return self.axis.value(np.linspace(0.0, 1.0, 2 * self.columns + 1))

    def column(self, value: float) -> int | None:
        """The column of cells that holds a value; None outside the plot."""
        if not self.axis.holds(value) or not self.columns:
            return None
        return self.left + min(self.columns - 1, int(float(self.axis.share(value)) * self.columns))

    def value_at(self, column: int) -> float | None:
        """The value in the middle of a column of cells; None outside the plot."""
        if not self.left <= column < self.right:
            return None
        return float(self.axis.value((column - self.left + 0.5) / self.columns))

    def stretch(self, low: float, high: float) -> slice:
        """Columns that a stretch of values touches, cut to the plot; none where it lies outside."""
        if not self.columns or not low <= high or high < self.axis.low or low > self.axis.high:
            return slice(self.left, self.left)
        shares = np.clip(self.axis.share([low, high]), 0.0, 1.0)
        first = min(self.columns - 1, int(shares[0] * self.columns))
        end = max(first + 1, min(self.columns, math.ceil(shares[1] * self.columns - 1e-9)))
        return slice(self.left + first, self.left + end)
