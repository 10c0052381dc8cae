"""A short linear predictor fitted near a blow, and where it fails.

Fitted to the ringing it foresees free decay down to the noise, forwards and backwards in time.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.innovation import Level

Real = NDArray[np.float64]

SHORTEST_GAP_S = 0.0075
"""Between two blows that can be told apart."""
ORDERS = (12, 24, 40)
_NEARLY = 1.7
_BEFORE_S = 0.03
_LOOK_S = 0.42
_LEAST_LOOK = 200
"""Samples a predictor is fitted to at the coarse levels."""
_TRIMS = 4
_KEEP = 0.9
_BLOCK_S = 0.02
_OVER_QUIET = 4.0
_SMEARED = 6
"""Samples over which lowering the rate spreads a contact."""


@dataclass(frozen=True)
class Errors:
    """Prediction error around a blow over its typical size, forwards or backwards."""

    time_s: Real
    """(n,) from the blow."""
    size: Real
    """(n,)"""
    rate_hz: float
    order: int
    """Of the predictor: for so many samples after a blow it errs still."""

    @property
    def smeared_s(self) -> float:
        """How long after a blow no second one can be told."""
        return max(SHORTEST_GAP_S, (self.order + _SMEARED) / self.rate_hz)

    @property
    def first(self) -> float:
        """Largest error at the blow itself."""
        near = np.abs(self.time_s) < self.smeared_s
        return float(self.size[near].max(initial=0.0))


def prediction_errors(
    level: Level,
    onset_s: float,
    until_s: float,
    *,
    backwards: bool = False,
    slack_s: float = 0.0,
    orders: Sequence[int] = ORDERS,
) -> Errors | None:
    """Errors from a little before the blow on; None where the stretch is too short to tell."""
    rate = level.rate_hz
    look_s = max(_LOOK_S, _LEAST_LOOK / rate) + slack_s
    first = max(int((onset_s - _BEFORE_S - slack_s) * rate) - ORDERS[-1], 0)
    last = min(int(min(onset_s + look_s, until_s) * rate), len(level.samples))
    last = first + ringing_part(level.samples[first:last], rate)
    stretch = level.samples[first:last]
    usable = [order for order in orders if order <= len(stretch) // 6]
    if not usable:
        return None
    size, order = sparing_errors(stretch[::-1] if backwards else stretch, usable)
    time_s = (first + np.arange(len(size))) / rate - onset_s
    return Errors(time_s, size[::-1] if backwards else size, rate, order)


def ringing_part(stretch: Real, rate_hz: float) -> int:
    """Samples up to where the ringing has sunk into the noise, at least a quarter of the stretch.

    A predictor fitted to noise alone would not know a heavily damped ringing.
    """
    block = max(int(_BLOCK_S * rate_hz), 4)
    count = len(stretch) // block
    if count < 4:
        return len(stretch)
    power = np.var(stretch[: count * block].reshape(count, block), axis=1)
    rings = np.flatnonzero(power > _OVER_QUIET * power.min())
    last = (int(rings[-1]) + 2) * block if len(rings) else 0
    return min(max(last, len(stretch) // 4), len(stretch))


def sparing_errors(stretch: Real, orders: Sequence[int]) -> tuple[Real, int]:
    """(n,) errors over their typical size by the lowest order nearly as good as the highest.

    A low order forgets a blow soon; many modes need a high one.
    """
    tried = [robust_errors(stretch, order) for order in orders]
    best = min(typical for _, typical in tried)
    chosen = next(i for i, (_, typical) in enumerate(tried) if typical <= _NEARLY * best)
    error, typical = tried[chosen]
    least = max(typical, float(np.abs(stretch).max()) * 1e-7, 1e-280)
    return error / least, orders[chosen]


def robust_errors(stretch: Real, order: int) -> tuple[Real, float]:
    """(n,) error of the least-squares predictor fitted where it works, and its median there.

    Trimmed least squares: the samples it predicts worst, which hold the blows, are left out. The
    first ``order`` samples have no past and get 0.
    """
    rows = np.lib.stride_tricks.sliding_window_view(stretch, order + 1)
    past, now = rows[:, :-1], rows[:, -1]
    ridge = (1e-10 * float(np.sum(stretch**2)) + 1e-280) * np.eye(order)
    kept = np.ones(len(now), bool)
    error = now
    for _ in range(_TRIMS):
        a = past[kept]
        weights = np.linalg.solve(a.T @ a + ridge, a.T @ now[kept])
        error = np.abs(now - past @ weights)
        kept = error <= np.quantile(error, _KEEP)
    freedom = max(1 - order / np.count_nonzero(kept), 0.1)
    return np.concatenate([np.zeros(order), error]), float(np.median(error)) / np.sqrt(freedom)
