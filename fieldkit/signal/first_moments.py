"""How far the first moments of a decay stand over the background.

A frame that fades in as well as out weighs a decay of a few cycles next to nothing. Windows that
begin at their height see it: half a raised cosine, of lengths that suit short decays.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.innovation import Level

Real = NDArray[np.float64]

_LENGTHS_S = (0.016, 0.064, 0.25)
_SMEAR = 8
"""Samples over which a contact is spread when the rate is lowered."""
_LEAST_BINS = 4
_LEAST_FRAMES = 16
"""Of the background, half a length apart: its mean is known to about a third."""
_MOST_FRAMES = 400


@dataclass(frozen=True)
class FirstMoments:
    """Power of the background as windows of several lengths see it."""

    level: Level
    highest_hz: float
    quiet: tuple[Real, ...]
    """(b,) by length, up to the highest frequency; empty where the background is too short."""

    def over(self, start_s: float, end_s: float) -> float:
        """Largest ratio of power to the background's, any length, any bin; 0 where none fits in.

        ``start_s`` is the end of the contact.
        """
        rate_hz = self.level.rate_hz
        first, past = int(np.ceil(start_s * rate_hz)) + _SMEAR, int(end_s * rate_hz)
        most = 0.0
        for length_s, quiet in zip(_LENGTHS_S, self.quiet, strict=True):
            count = int(length_s * rate_hz)
            if len(quiet) and first + count <= past:
                part = self.level.samples[first : first + count]
                power = powers(part[None], rate_hz, self.highest_hz)[0]
                most = max(most, float(np.max(power / quiet)))
        return most


def first_moments(
    level: Level, highest_hz: float, background_s: tuple[float, float]
) -> FirstMoments:
    """The background of a recording, ready to judge its blows."""
    first, past = (round(at_s * level.rate_hz) for at_s in background_s)
    quiet = level.samples[max(first, 0) : max(past, 0)]
    means = tuple(mean_power(quiet, level.rate_hz, highest_hz, s) for s in _LENGTHS_S)
    return FirstMoments(level, highest_hz, means)


def mean_power(quiet: Real, rate_hz: float, highest_hz: float, length_s: float) -> Real:
    """(b,) mean power of a stretch, each bin no lower than the mean with its neighbours."""
    count = int(length_s * rate_hz)
    if count < 2 * _LEAST_BINS or len(quiet) < (_LEAST_FRAMES + 1) * count // 2:
        return np.zeros(0)
    step = max(count // 2, (len(quiet) - count) // _MOST_FRAMES)
    frames = np.lib.stride_tricks.sliding_window_view(quiet, count)[::step]
    mean = powers(frames, rate_hz, highest_hz).mean(axis=0)
    edged = np.pad(mean, 1, mode="edge")
    smooth = np.maximum(mean, (edged[:-2] + edged[1:-1] + edged[2:]) / 3)
    return np.asarray(np.maximum(smooth, 1e-12 * smooth.max() + 1e-300))


def powers(frames: Real, rate_hz: float, highest_hz: float) -> Real:
    """(f, b) power of frames through a window that begins at its height."""
    count = frames.shape[1]
    window = np.cos(np.pi / 2 * np.arange(count) / count) ** 2
    spectra = np.fft.rfft(frames * window, axis=1)[:, : int(highest_hz * count / rate_hz) + 1]
    return np.asarray(spectra.real**2 + spectra.imag**2)
