"""Level of each channel as a meter shows it: peak, peak hold, clip lamp."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from fieldkit.capture.source import Block

HOLD_S = 2.0
FALL_DB_PER_S = 20.0
RAIL = 0.999
"""Share of full scale from which on a sample counts as clipped."""


@dataclass(frozen=True, slots=True)
class ChannelLevel:
    """One channel, in parts of full scale."""

    peak: float
    """Rises at once, falls by FALL_DB_PER_S."""
    held: float
    """The highest peak of the last HOLD_S."""
    clipped: bool
    """Whether a sample was at the rail within the last HOLD_S."""
    clipped_samples: int
    """Since the meter was reset."""


class Meter:
    """Levels of all channels, block by block."""

    def __init__(self, *, rate_hz: float, channels: int) -> None:
        self._rate_hz = rate_hz
        self._channels = channels
        self.reset()

    def reset(self) -> None:
        """Back to silence, lamps off."""
        self._peak = np.zeros(self._channels)
        self._held = np.zeros(self._channels)
        self._held_for_s = np.zeros(self._channels)
        self._since_clip_s = np.full(self._channels, np.inf)
        self._clipped = np.zeros(self._channels, int)

    def feed(self, block: Block) -> None:
        """Take a block in."""
        if not len(block.samples):
            return
        length_s = len(block.samples) / self._rate_hz
        size = np.abs(block.samples)
        peak = size.max(axis=0)
        clips = np.count_nonzero(size >= RAIL, axis=0)
        self._peak = np.maximum(peak, self._peak * 10 ** (-FALL_DB_PER_S * length_s / 20))
        self._held_for_s += length_s
        new = (peak >= self._held) | (self._held_for_s > HOLD_S)
        self._held = np.where(new, self._peak, self._held)
        self._held_for_s = np.where(new, 0.0, self._held_for_s)
        self._clipped += clips
        self._since_clip_s = np.where(clips > 0, 0.0, self._since_clip_s + length_s)

    @property
    def levels(self) -> tuple[ChannelLevel, ...]:
        """As of the last block."""
        return tuple(
            ChannelLevel(
                float(self._peak[i]),
                float(self._held[i]),
                bool(self._since_clip_s[i] < HOLD_S),
                int(self._clipped[i]),
            )
            for i in range(self._channels)
        )


def decibels(share: float, least: float = -99.0) -> float:
    """A share of full scale as dB below it."""
    return max(least, 20 * math.log10(share)) if share > 0 else least
