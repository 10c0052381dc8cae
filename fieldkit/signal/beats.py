"""How long a decay still beats with the steady lines of the background that stand over it.

A line fills the bin in which a mode rings: power there never falls to a floor, and the end of the
ringing cannot be seen. But the power of a steady line holds, and a decay that has sunk far below it
still moves it: by twice the product of the two amplitudes.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]

FRAME_S = 1.0
"""Long enough to tell the orders of a slow machine apart."""
_LEAST_FRAMES = 4
_LEVEL_HOLDS = 0.3
"""Standard deviation over mean of the power that a steady line fills; of noise it is near 1."""
_OVER_FLOOR = 10.0
_AROUND = 16
_FLOOR_SHARE = 0.1


def beats(
    samples: Real, rate_hz: float, starts: NDArray[np.intp], background_s: tuple[float, float]
) -> Real:
    """(f,) how far the power about steady lines strays from that of the background.

    Squared, over its variance there; the largest of all lines, for frames of FRAME_S that begin at
    the given samples, in ascending order. 0 past the last whole one, and where no line stands out
    of the background or that is too short.
    """
    length = int(FRAME_S * rate_hz)
    out = np.zeros(len(starts))
    whole = starts[starts + length <= len(samples)]
    first_s, last_s = background_s
    quiet = (whole >= first_s * rate_hz) & (whole + length <= last_s * rate_hz)
    if np.count_nonzero(quiet) < _LEAST_FRAMES:
        return out
    frames = np.lib.stride_tricks.sliding_window_view(samples, length)[whole]
    spectra = np.fft.rfft(frames * np.hanning(length + 1)[:-1], axis=1)[:, 1:]
    power = lobes(spectra.real**2 + spectra.imag**2)
    mean, spread = power[quiet].mean(axis=0), power[quiet].std(axis=0, ddof=1)
    floor = noise_floor(mean)
    filled = (mean > _OVER_FLOOR * floor) & (spread < _LEVEL_HOLDS * mean)
    if np.any(filled):
        spread = np.maximum(spread, np.sqrt(2 * mean * floor + floor**2))[filled]
        strays = (power[:, filled] - mean[filled]) / (spread + 1e-300)
        out[: len(whole)] = np.max(strays**2, axis=1)
    return out


def lobes(power: Real) -> Real:
    """(f, b - 2) sums over three bins: a line between two of them reads like one amid a bin."""
    return np.asarray(power[:, :-2] + power[:, 1:-1] + power[:, 2:])


def noise_floor(mean: Real) -> Real:
    """(b,) what lies between the lines."""
    from scipy.ndimage import percentile_filter

    return np.asarray(percentile_filter(mean, 100 * _FLOOR_SHARE, 2 * _AROUND + 1, mode="reflect"))
