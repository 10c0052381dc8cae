"""What linear prediction cannot foresee: a blow, at several scales of time."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.decimation import lowpass
from fieldkit.signal.filtering import filtered, median

Real = NDArray[np.float64]

_FINEST_RATE_HZ = 4000.0
_COARSEST_RATE_HZ = 60.0
_SCALE = 2
_STOPBAND_DB = 50.0
_ORDER_FINEST = 24
_ORDER = 12
_BLOCK = 4
_RIDGE = 1e-7


@dataclass(frozen=True)
class Level:
    """A recording at one scale of time, low-passed without delay."""

    samples: Real
    """(n,)"""
    rate_hz: float


@dataclass(frozen=True)
class Innovation:
    """Energy of the prediction error in short blocks, over its median."""

    energy: Real
    """(b,) 1 is typical of the whole recording."""
    block_s: float
    order_s: float
    """Memory of the predictor."""


def levels(signal: Real, rate_hz: float) -> list[Level]:
    """The recording at about 4 kHz (or its own lower rate), half of that, and so on to 60 Hz."""
    level = lowered(Level(signal, rate_hz), _FINEST_RATE_HZ)
    level = Level(level.samples - median(level.samples), level.rate_hz)
    out = [level]
    while level.rate_hz / _SCALE >= _COARSEST_RATE_HZ and len(level.samples) > 40 * _SCALE:
        level = lowered(level, level.rate_hz / _SCALE)
        out.append(level)
    return out


def innovations(scales: Sequence[Level]) -> list[Innovation]:
    """Innovation at each level."""
    orders = [_ORDER_FINEST] + [_ORDER] * (len(scales) - 1)
    return [innovation(s.samples, s.rate_hz, o) for s, o in zip(scales, orders, strict=True)]


def lowered(level: Level, wanted_hz: float) -> Level:
    """The next whole fraction of the rate that is not below the wanted one."""
    step = int(level.rate_hz // wanted_hz)
    if step < 2:
        return level
    rate = level.rate_hz
    kernel = lowpass(rate, 0.35 * rate / step, 0.65 * rate / step, _STOPBAND_DB)
    return Level(every(step, level.samples, kernel), rate / step)


def every(step: int, samples: Real, kernel: Real) -> Real:
    """(ceil(n / step),) every so-manieth sample of a signal (n,) filtered without delay.

    Both are cut into pieces of one step, so that one product of matrices does the work: the sum
    over each piece of the kernel, at each piece of the signal.
    """
    count = (len(samples) - 1) // step + 1
    pieces = -(-len(kernel) // step)
    half = len(kernel) // 2
    past = (count + pieces) * step - half - len(samples)
    padded = np.pad(samples, (half, max(past, 0)), mode="edge")
    weights = np.pad(kernel, (0, pieces * step - len(kernel))).reshape(pieces, step)
    sums = weights @ padded[: (count + pieces) * step].reshape(-1, step).T
    out = np.zeros(count)
    for piece in range(pieces):
        out += sums[piece, piece : piece + count]
    return out


def innovation(signal: Real, rate_hz: float, order: int) -> Innovation:
    """Block energies of the error of a linear prediction that weighs loud and quiet parts alike."""
    order = min(order, max(len(signal) // 20, 1))
    error = filtered(signal, predictor(levelled(signal, rate_hz), order))
    error[:order] = 0.0
    blocks = max(len(error) // _BLOCK, 1)
    energy = np.sum(error[: blocks * _BLOCK].reshape(blocks, -1) ** 2, axis=1)
    typical = median(energy)
    floor = max(typical, float(energy.max(initial=0.0)) * 1e-12, 1e-300)
    return Innovation(energy / floor, _BLOCK / rate_hz, order / rate_hz)


def levelled(signal: Real, rate_hz: float) -> Real:
    """The signal over its short-time level, so that a loud decay does not rule the predictor."""
    width = min(max(int(0.03 * rate_hz), 8), len(signal))
    power = smooth(signal**2, width)
    floor = max(median(power) * 1e-3, float(power.max(initial=0.0)) * 1e-12, 1e-300)
    return np.asarray(signal / np.sqrt(power + floor))


def smooth(values: Real, width: int) -> Real:
    """(n,) running mean, over fewer values at the ends."""
    count, before = len(values), width // 2
    total = np.concatenate([np.zeros(before + 1), np.cumsum(values)])
    total = np.concatenate([total, np.full(width - before, total[-1])])
    at = np.arange(count)
    inside = np.minimum(at - before + width, count) - np.maximum(at - before, 0)
    return np.asarray(np.maximum(total[width : width + count] - total[:count], 0.0) / inside)


def predictor(signal: Real, order: int) -> Real:
    """(order + 1,) prediction-error filter by the autocorrelation method."""
    from scipy.linalg import solve_toeplitz

    count = len(signal)
    lags = np.array([signal[lag:] @ signal[: count - lag] for lag in range(order + 1)])
    if lags[0] <= 0:
        return np.array([1.0])
    column = lags[:-1].copy()
    column[0] *= 1 + _RIDGE
    return np.concatenate([[1.0], -solve_toeplitz(column, lags[1:])])
