"""How long a blow rings over the background, by short-time spectra."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.beats import FRAME_S as BEATS_S
from fieldkit.signal.beats import beats
from fieldkit.signal.innovation import Level

Real = NDArray[np.float64]

_FRAME_S = 0.25
_LEAST_FRAMES = 4
_LOW_SHARE = 0.1
RINGS = 20.0
"""Power over the background's, in any one bin, that noise alone hardly reaches."""


@dataclass(frozen=True)
class Ringing:
    """Short-time power against the background's."""

    time_s: Real
    """(f,) centres of the frames."""
    frequency_hz: Real
    """(b,) of the bins, 0 left out."""
    power: Real
    """(f, b)"""
    quiet: Real
    """(b,) the background's."""
    over: Real
    """(f,) largest ratio of power to background over all bins."""
    excess: Real
    """(f,) power above the background, all bins together."""
    beats: Real
    """(f,) how far the power about steady lines strays, in longer frames that begin with these."""

    @property
    def frame_s(self) -> float:
        """Length of a frame."""
        return _FRAME_S

    @property
    def hop_s(self) -> float:
        """Time from frame to frame; 0 where there is only one."""
        return float(self.time_s[1] - self.time_s[0]) if len(self.time_s) > 1 else 0.0

    def between(self, first_s: float, last_s: float) -> NDArray[np.intp]:
        """Frames whose whole stretch lies between two times."""
        half = _FRAME_S / 2
        return np.flatnonzero((self.time_s - half >= first_s) & (self.time_s + half <= last_s))

    def end_s(self, start_s: float, limit_s: float) -> float:
        """When the ringing that begins at start has sunk into the background."""
        frames = self.between(start_s, limit_s)
        alone = self.time_s[frames] - _FRAME_S / 2 + BEATS_S <= limit_s
        quiet = (self.over[frames] < RINGS) & ~(alone & (self.beats[frames] > RINGS))
        settled = np.flatnonzero(quiet[:-2] & quiet[1:-1] & quiet[2:])
        if not len(settled):
            return limit_s
        return float(min(self.time_s[frames[settled[0]]] + _FRAME_S, limit_s))

    def strongest(self, start_s: float, limit_s: float) -> float:
        """Largest ratio to the background in a stretch; infinite where no frame fits in."""
        frames = self.between(start_s, limit_s)
        return float(self.over[frames].max()) if len(frames) else np.inf

    def last(self, start_s: float, limit_s: float) -> float:
        """Ratio to the background just before a limit; infinite where no frame fits in."""
        frames = self.between(start_s, limit_s)
        return float(np.median(self.over[frames[-3:]])) if len(frames) else np.inf

    def drop_db(self, start_s: float, limit_s: float) -> float:
        """How far the ringing falls from its start to the limit; 0 where no two frames fit in."""
        frames = self.between(start_s, limit_s)
        if len(frames) < 2:
            return 0.0
        ends = np.maximum(self.excess[[frames[0], frames[-1]]], 1e-300)
        return float(10 * (np.log10(ends[0]) - np.log10(ends[1])))


def ringing(level: Level, background_s: tuple[float, float]) -> Ringing:
    """Short-time picture of a recording; without background its quietest frames stand for it."""
    length = max(int(_FRAME_S * level.rate_hz), 8)
    hop = max(length // 4, 1)
    if len(level.samples) < length:
        nothing = np.zeros(0)
        return Ringing(nothing, nothing, np.zeros((0, 0)), nothing, nothing, nothing, nothing)
    frames = np.lib.stride_tricks.sliding_window_view(level.samples, length)[::hop]
    window = np.hanning(length + 1)[:-1]
    spectra: NDArray[np.complex128] = np.fft.rfft(frames * window, axis=1)[:, 1:]
    power: Real = spectra.real**2 + spectra.imag**2
    time_s: Real = (np.arange(len(frames), dtype=float) * hop + length / 2) / level.rate_hz
    quiet = background_power(power, time_s, background_s)
    ratio = power / quiet
    excess = np.maximum(power - 3 * quiet, 0).sum(axis=1)
    frequency_hz = np.arange(1, power.shape[1] + 1) * level.rate_hz / length
    starts = np.arange(len(frames)) * hop
    strays = beats(level.samples, level.rate_hz, starts, background_s)
    return Ringing(time_s, frequency_hz, power, quiet, ratio.max(axis=1), excess, strays)


def frames_inside(time_s: Real, background_s: tuple[float, float]) -> NDArray[np.bool_]:
    """(f,) True for frames that lie wholly in the background."""
    half = _FRAME_S / 2
    return (time_s - half >= background_s[0]) & (time_s + half <= background_s[1])


def background_power(power: Real, time_s: Real, background_s: tuple[float, float]) -> Real:
    """(bins,) mean power of the background, smoothed upwards over neighbouring bins."""
    inside = frames_inside(time_s, background_s)
    if np.count_nonzero(inside) >= _LEAST_FRAMES:
        mean = power[inside].mean(axis=0)
    else:
        mean = np.quantile(power, _LOW_SHARE, axis=0) / -np.log1p(-_LOW_SHARE)
    edged = np.pad(mean, 1, mode="edge")
    smooth = np.maximum(mean, (edged[:-2] + edged[1:-1] + edged[2:]) / 3)
    least = max(float(power.max()) * 1e-12, 1e-300)
    return np.asarray(np.maximum(smooth, least))
