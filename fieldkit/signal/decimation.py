"""Lower the rate of a free decay without harming it.

A finite filter used only where it fits wholly inside the record turns a damped exponential into the
same damped exponential with another amplitude, so nothing rings in and no pole moves.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

_STOPBAND_DB = 80.0


def decimate(
    samples: NDArray[np.float64], rate_hz: float, *, keep_hz: float, wanted_rate_hz: float
) -> tuple[NDArray[np.float64], float]:
    """Samples at the lowest whole fraction of the rate that is not below ``wanted_rate_hz``.

    Below ``keep_hz`` nothing aliases in above -80 dB. Returns (m,) samples and their rate.
    """
    step = int(rate_hz // wanted_rate_hz)
    if step < 2:
        return samples, rate_hz
    filter_taps = lowpass(rate_hz, keep_hz, rate_hz / step - keep_hz)
    if len(samples) < 4 * len(filter_taps):
        return samples, rate_hz
    return by_phases(samples, filter_taps, step), rate_hz / step


def by_phases(
    samples: NDArray[np.float64], weights: NDArray[np.float64], step: int
) -> NDArray[np.float64]:
    """Every ``step``-th value of the samples weighted by a filter that lies wholly inside them."""
    turns = -(-len(weights) // step)
    phases = np.zeros(turns * step)
    phases[: len(weights)] = weights
    blocks = samples[: len(samples) // step * step].reshape(-1, step)
    count = len(blocks) - turns + 1
    out = np.zeros(count)
    for turn in range(turns):
        out += blocks[turn : turn + count] @ phases[turn * step : (turn + 1) * step]
    return out


@lru_cache(maxsize=64)
def lowpass(
    rate_hz: float, pass_hz: float, stop_hz: float, stopband_db: float = _STOPBAND_DB
) -> NDArray[np.float64]:
    """(n,) linear-phase low-pass of unit gain at 0 Hz by the Kaiser window (Kaiser 1974)."""
    width = 2 * np.pi * (stop_hz - pass_hz) / rate_hz
    count = 2 * int(np.ceil((stopband_db - 8) / (2.285 * width) / 2)) + 1
    beta = 0.1102 * (stopband_db - 8.7)
    at = np.arange(count) - (count - 1) / 2
    ideal = np.sinc((pass_hz + stop_hz) / rate_hz * at)
    weights = ideal * np.kaiser(count, beta)
    weights /= weights.sum()
    weights.flags.writeable = False
    return np.asarray(weights)
