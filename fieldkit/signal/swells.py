"""Blows too soft or weak for prediction to notice: a line of the spectrum that swells at once."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.innovation import Level
from fieldkit.signal.ringing import Ringing

Real = NDArray[np.float64]

_JUMP = 8.0
"""Power just after over the highest of the seconds before, in one bin."""
_OVER_QUIET = 35.0
"""Power just after over the background's."""
APART_S = 0.4
_MEMORY_S = 2.0
"""Two lines that beat swell again within this time, but not above where they were."""
_FINE_S = 0.1
_REACHED = 0.6


@dataclass(frozen=True)
class Swell:
    """A line that rises from the background within a fraction of a second."""

    at_s: float
    full_s: float
    """When it has reached its height."""
    middle_s: float
    """Between the frames before and after it."""


def swells(level: Level, picture: Ringing) -> list[Swell]:
    """All rises, in order."""
    found: list[Swell] = []
    step = round(picture.frame_s / picture.hop_s) if picture.hop_s > 0 else 0
    if step < 1 or len(picture.power) <= 2 * step:
        return found
    before, after = highest_before(picture)[:-step], picture.power[step:]
    ratio = after / np.maximum(before, _OVER_QUIET / _JUMP * picture.quiet)
    jump, line = ratio.max(axis=1), ratio.argmax(axis=1)
    while len(jump) and jump.max() > _JUMP:
        at = int(jump.argmax())
        middle_s = float(picture.time_s[at] + picture.time_s[at + step]) / 2
        centres = (picture.time_s[:-step] + picture.time_s[step:]) / 2
        jump = np.where(np.abs(centres - middle_s) < APART_S, 0.0, jump)
        found.append(refined(level, middle_s, float(picture.frequency_hz[line[at]])))
    return sorted(found, key=lambda s: s.at_s)


def highest_before(picture: Ringing) -> Real:
    """(f, b) highest power of the last seconds in each bin and its neighbours."""
    from scipy.ndimage import maximum_filter

    frames = max(round(_MEMORY_S / picture.hop_s), 2)
    origin = ((frames - 1) // 2, 0)
    return np.asarray(maximum_filter(picture.power, (frames, 3), origin=origin, mode="nearest"))


def refined(level: Level, about_s: float, frequency_hz: float) -> Swell:
    """Start and top of a rise from the envelope of its line."""
    first = max(int((about_s - APART_S) * level.rate_hz), 0)
    stretch = level.samples[first : int((about_s + APART_S) * level.rate_hz)]
    time_s = (first + np.arange(len(stretch))) / level.rate_hz
    width = max(int(_FINE_S * level.rate_hz), 4)
    window = np.hanning(width + 2)[1:-1]
    turned = stretch * np.exp(-2j * np.pi * frequency_hz * time_s)
    envelope = np.abs(np.convolve(turned, window / window.sum(), mode="same"))
    top = int(envelope.argmax())
    low = np.flatnonzero(envelope[: top + 1] < _REACHED / 2 * envelope[top])
    start_s = float(time_s[low[-1]]) if len(low) else float(time_s[0])
    return Swell(start_s, float(time_s[top]) + _FINE_S / 2, about_s)
