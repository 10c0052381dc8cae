"""A short linear predictor fitted to the ringing after all blows together, and where it fails.

The structure rings at the same frequencies after every blow, so one predictor serves them all: it
foresees free decay down to the noise, forwards and backwards in time, and fails while a force acts.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.filtering import filtered, median, medians
from fieldkit.signal.innovation import Level

Real = NDArray[np.float64]

SHARP = 8.0
"""Error over its typical size: above it at a blow, below 7 where there is none."""
SHORTEST_GAP_S = 0.0075
"""Between two blows that can be told apart."""
ORDERS = (12, 24, 40)
_NEARLY = 1.7
_BEFORE_S = 0.03
_LOOK_S = 0.42
_LEAST_LOOK = 200
"""Samples a predictor is fitted to at the coarse levels."""
_MOST_STRETCHES = 12
_TRIMS = 3
_KEEP = 0.9
_RIDGE = 1e-10
_BLOCK_S = 0.02
_OVER_QUIET = 4.0
_SMEARED = 6
"""Samples over which lowering the rate spreads a contact."""
_TYPICAL_S = 0.025
_TYPICAL = 16
"""Samples at least whose median error is typical of their time."""
_ENOUGH = 33
_AROUND = 5


@dataclass(frozen=True)
class Predictor:
    """Weights of the past samples, the latest first."""

    weights: Real
    """(p,)"""

    @property
    def order(self) -> int:
        """Samples of the past it looks at."""
        return len(self.weights)

    def errors(self, samples: Real) -> Real:
        """(n,) absolute errors; 0 for the first samples, which have no past."""
        missed = filtered(samples, np.concatenate([[1.0], -self.weights]))
        missed[: self.order] = 0.0
        return np.abs(missed)


@dataclass(frozen=True)
class Errors:
    """Prediction error of a whole recording at one level, over what is typical of its time."""

    size: Real
    """(n,)"""
    raw: Real
    """(n,) in the samples' unit."""
    rate_hz: float
    order: int
    """Of the predictor: for so many samples after a blow it errs still."""

    @property
    def strongest(self) -> float:
        """Highest error of all, in the samples' unit."""
        return float(self.raw.max())

    @property
    def sharp(self) -> NDArray[np.intp]:
        """Where it is far above the typical size, the first and last samples left out."""
        where = np.flatnonzero(self.size > SHARP)
        edge = self.order + _SMEARED
        return where[(where > edge) & (where < len(self.size) - edge)]

    @property
    def smeared_s(self) -> float:
        """How long after a blow no second one can be told."""
        return max(SHORTEST_GAP_S, (self.order + _SMEARED) / self.rate_hz)

    def between(self, first_s: float, past_s: float) -> slice:
        """Samples of a stretch of time."""
        first = max(int(np.ceil(first_s * self.rate_hz)), 0)
        return slice(first, max(int(np.ceil(past_s * self.rate_hz)), first))

    def highest_at(self, times_s: Sequence[float]) -> float:
        """Highest error about any of some times, in the samples' unit."""
        near = (self.between(at_s - 0.01, at_s + 0.02) for at_s in times_s)
        return max((float(self.raw[part].max(initial=0.0)) for part in near), default=0.0)


def errors_of(level: Level, anchors_s: Sequence[float]) -> Errors | None:
    """Forward errors by what was learnt after the anchors; None where that is too little."""
    predictor = learnt(ringing_stretches(level, anchors_s))
    if predictor is None:
        return None
    raw = predictor.errors(level.samples)
    least = max(float(np.abs(level.samples).max()) * 1e-7, 1e-280)
    size = raw / np.maximum(typical(raw, level.rate_hz), least)
    return Errors(size, raw, level.rate_hz, predictor.order)


def backward_predictor(level: Level, anchors_s: Sequence[float]) -> Predictor | None:
    """The predictor of the past from the future, for samples turned round."""
    return learnt([stretch[::-1] for stretch in ringing_stretches(level, anchors_s)])


def typical(raw: Real, rate_hz: float) -> Real:
    """(n,) running median of the medians of short blocks."""
    block = min(max(int(_TYPICAL_S * rate_hz), _TYPICAL), len(raw))
    count = len(raw) // block
    stride = max(block // _ENOUGH, 1)
    each = medians(raw[: count * block].reshape(count, block)[:, ::stride])
    padded = np.pad(each, _AROUND // 2, mode="reflect" if count > _AROUND else "edge")
    around = medians(np.lib.stride_tricks.sliding_window_view(padded, _AROUND))
    return np.concatenate([np.repeat(around, block), np.full(len(raw) - count * block, around[-1])])


def ringing_stretches(level: Level, anchors_s: Sequence[float]) -> list[Real]:
    """What rings from a little before each anchor on, each of unit power."""
    rate = level.rate_hz
    look_s = max(_LOOK_S, _LEAST_LOOK / rate)
    chosen = np.unique(np.linspace(0, len(anchors_s) - 1, _MOST_STRETCHES).astype(int))
    stretches = []
    for at_s in (anchors_s[i] for i in chosen if anchors_s):
        first = max(int((at_s - _BEFORE_S) * rate) - ORDERS[-1], 0)
        last = min(int((at_s + look_s) * rate), len(level.samples))
        stretch = level.samples[first : first + ringing_part(level.samples[first:last], rate)]
        power = float(np.mean(stretch**2)) if len(stretch) else 0.0
        if power > 0:
            stretches.append(stretch / np.sqrt(power))
    return stretches


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


def learnt(stretches: Sequence[Real]) -> Predictor | None:
    """The predictor of the lowest order nearly as good as the highest, by trimmed least squares.

    The samples it predicts worst, which hold the blows, are left out (Rousseeuw 1984). A low order
    forgets a blow soon; many modes need a high one.
    """
    total = sum(len(stretch) for stretch in stretches)
    orders = [order for order in ORDERS if order <= total // 6]
    rows = [past_and_now(stretch, orders[-1]) for stretch in stretches] if orders else []
    if sum(len(r) for r in rows) <= 3 * (orders[-1] if orders else 1):
        return None
    data = np.concatenate(rows)
    past, now = data[:, 1:], data[:, 0]
    products = data.T @ data
    kept = products
    weights = solved(kept, orders[-1])
    for _ in range(_TRIMS - 1):
        error = np.abs(now - past @ weights)
        bad = data[error > quantile(error, _KEEP)]
        kept = products - bad.T @ bad
        weights = solved(kept, orders[-1])
    best = median(np.abs(now - past @ weights))
    for order in orders[:-1]:
        fewer = solved(kept, order)
        if median(np.abs(now - past[:, :order] @ fewer)) <= _NEARLY * best:
            return Predictor(fewer)
    return Predictor(weights)


def past_and_now(stretch: Real, order: int) -> Real:
    """(n - order, order + 1) each sample and those before it, the latest first."""
    if len(stretch) <= order:
        return np.zeros((0, order + 1))
    return np.lib.stride_tricks.sliding_window_view(stretch, order + 1)[:, ::-1]


def solved(products: Real, order: int) -> Real:
    """(order,) least-squares weights from the sums of products of samples and their past."""
    square = products[1 : order + 1, 1 : order + 1]
    ridge = (_RIDGE * float(np.trace(products)) + 1e-280) * np.eye(order)
    return np.asarray(np.linalg.solve(square + ridge, products[1 : order + 1, 0]))


def quantile(values: Real, share: float) -> float:
    """The value that a share of them does not exceed."""
    at = min(int(share * len(values)), len(values) - 1)
    return float(np.partition(values, at)[at])
