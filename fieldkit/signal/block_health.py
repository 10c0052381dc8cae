"""Whether a record that arrives in blocks can be trusted: what ``health`` says of a whole one."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.clipping import clipped_at
from fieldkit.signal.health import SHARES, clipping_warning, level_warning, offset_warnings

Real = NDArray[np.float64]

_AT_RAIL = 2e-3
"""Of the highest sample: what stays farther below it stands at no rail of the record."""
_LEAST_AT_RAIL = 3


class BlockHealth:
    """Sums over the quarters of a record of known length, and its samples at a rail."""

    def __init__(self, frames: int, full_scale: float | None) -> None:
        share, rest = divmod(frames, SHARES)
        self._past = np.cumsum([share + (i < rest) for i in range(SHARES)])
        self._frames, self._full_scale = frames, full_scale
        self._at = 0
        self._sums = np.zeros((SHARES, 6))
        """1, x, x^2, t, t^2 and t x, with the time t from -1 to 1 over the record."""
        self._rails: list[tuple[float, int]] = []
        self._low, self._high = np.inf, -np.inf

    def add(self, block: Real) -> None:
        """Take in the next samples (n,), which must be finite."""
        low, high = float(block.min()), float(block.max())
        self._low, self._high = min(self._low, low), max(self._high, high)
        top = max(-low, high)
        if top >= (1 - _AT_RAIL) * self._top:
            self._rails.append((top, _clipped(block, top, self._full_scale)))
        while len(block):
            quarter = int(np.searchsorted(self._past, self._at, side="right"))
            piece, block = np.split(block, [int(self._past[quarter]) - self._at])
            self._sums[quarter] += _moments(piece, self._at, self._frames)
            self._at += len(piece)

    @property
    def silent(self) -> bool:
        """Whether all samples are equal."""
        return not self._high > self._low

    def warnings(self) -> tuple[str, ...]:
        """On clipping, offset and drift, and a level that changes."""
        mean, slope = self._straight_line()
        powers = [_residual(sums, mean, slope) for sums in self._sums]
        rms = float(np.sqrt(np.average(powers, weights=self._sums[:, 0])))
        rails = sum(count for top, count in self._rails if top >= (1 - _AT_RAIL) * self._top)
        return (
            *clipping_warning(rails),
            *offset_warnings(mean, slope, rms),
            *level_warning([float(np.sqrt(power)) for power in powers]),
        )

    @property
    def _top(self) -> float:
        return max(-self._low, self._high)

    def _straight_line(self) -> tuple[float, float]:
        """Mean, and slope over half the record."""
        count, x, _, _, tt, tx = self._sums.sum(axis=0)
        return float(x / count), float(tx / tt)


def _clipped(block: Real, top: float, full_scale: float | None) -> int:
    near = np.count_nonzero(np.abs(block) >= (1 - _AT_RAIL) * top)
    return len(clipped_at(block, full_scale)) if near >= _LEAST_AT_RAIL else 0


def _moments(piece: Real, first: int, frames: int) -> Real:
    t = 2 / max(frames - 1, 1) * np.arange(first, first + len(piece)) - 1
    return np.array([len(piece), piece.sum(), piece @ piece, t.sum(), t @ t, t @ piece])


def _residual(sums: Real, mean: float, slope: float) -> float:
    """Mean square of what is left of a quarter without the straight line."""
    count, x, xx, t, tt, tx = sums
    line = mean**2 * count + 2 * mean * slope * t + slope**2 * tt
    return float(max(xx - 2 * mean * x - 2 * slope * tx + line, 0.0) / count)
