"""Recordings: samples with their rate, and what each channel measures."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

QUANTITIES = ("acceleration", "velocity", "displacement", "pressure")
SI_UNIT = {"acceleration": "m/s^2", "velocity": "m/s", "displacement": "m", "pressure": "Pa"}


@dataclass(frozen=True)
class Channel:
    """What one column of samples is."""

    name: str
    quantity: str | None = None
    """One of QUANTITIES; None where nobody said."""
    scale: float | None = None
    """SI units of the quantity per unit of sample; None where uncalibrated."""


@dataclass(frozen=True)
class Recording:
    """Samples as read from a file."""

    samples: NDArray[np.float64]
    """(n, channels), in the file's own unit: full scale 1 for audio, the column's unit for CSV."""
    rate_hz: float
    channels: tuple[Channel, ...]
    source: str
    """File name, for messages."""
    full_scale: float | None
    """Sample value at which the file format clips; None where it has no rail (CSV, float audio)."""
    notes: tuple[str, ...] = ()
    """What was done while reading, such as resampling, in words for the user."""

    @property
    def duration_s(self) -> float:
        """Length in time."""
        return len(self.samples) / self.rate_hz
