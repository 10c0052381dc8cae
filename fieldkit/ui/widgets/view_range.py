"""The stretch of an axis that a plot shows."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fieldkit.ui.widgets.ticks import linear_ticks, log_ticks

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Axis:
    """From ``low`` to ``high``, evenly or by decades (then ``low`` is above zero)."""

    low: float
    high: float
    log: bool = False

    def share(self, values: ArrayLike) -> Floats:
        """Where values lie, 0 at ``low`` to 1 at ``high``; -inf for zero and less by decades."""
        low, high = self._ends
        return (self._stretched(np.asarray(values, dtype=float)) - low) / (high - low)

    def value(self, share: ArrayLike) -> Floats:
        """The values at shares of the axis."""
        low, high = self._ends
        values = low + np.asarray(share, dtype=float) * (high - low)
        return 10.0**values if self.log else values

    def holds(self, value: float) -> bool:
        """Whether a value lies on the axis."""
        return self.low <= value <= self.high

    def panned(self, share: float) -> Axis:
        """Moved by a share of its length."""
        low, high = self.value([share, 1 + share])
        return replace(self, low=float(low), high=float(high))

    def zoomed(self, factor: float, about: float) -> Axis:
        """``factor`` times as long, the value ``about`` kept in place."""
        fixed = float(self.share(about))
        fixed = min(1.0, max(0.0, fixed)) if math.isfinite(fixed) else 0.5
        low, high = self.value([fixed - fixed * factor, fixed + (1 - fixed) * factor])
        return replace(self, low=float(low), high=float(high))

    def kept_within(self, limits: Axis, least_share: float = 1e-4) -> Axis:
        """Moved and cut so that it stays inside ``limits`` and no shorter than a share of them."""
        low, high = (float(end) for end in limits.share([self.low, self.high]))
        length = min(1.0, max(least_share, high - low))
        start = min(1.0 - length, max(0.0, 0.5 * (low + high - length)))
        low, high = (float(end) for end in limits.value([start, start + length]))
        return Axis(low, high, limits.log)

    def ticks(self, most: int) -> Floats:
        """Round values on the axis."""
        ticks = log_ticks if self.log else linear_ticks
        return ticks(self.low, self.high, most)

    @property
    def _ends(self) -> tuple[float, float]:
        low, high = (
            (math.log10(self.low), math.log10(self.high)) if self.log else (self.low, self.high)
        )
        return low, high if high > low else low + 1.0

    def _stretched(self, values: Floats) -> Floats:
        if not self.log:
            return values
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.where(
                values > 0, np.log10(values), np.where(np.isnan(values), np.nan, -np.inf)
            )
