"""Periodogram of a running record whose machine lines were taken out."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.machine_lines import MachineLine
from fieldkit.signal.whittle import Zone

Real = NDArray[np.float64]

_FILL_BINS = 12


@dataclass(frozen=True)
class Periodogram:
    """One-sided power of a whole record in bins one over its duration apart."""

    power: Real
    """(bins,) unit squared per hertz, from 0 Hz on."""
    believed: NDArray[np.bool_]
    """(bins,) False where a machine line stood."""
    duration_s: float

    @property
    def step_hz(self) -> float:
        """Distance of bins."""
        return 1 / self.duration_s

    @classmethod
    def of(cls, signal: Real, rate_hz: float, lines: Sequence[MachineLine]) -> Periodogram:
        """Of a record (n,), its mean removed."""
        duration_s = len(signal) / rate_hz
        power = 2 / (rate_hz * len(signal)) * np.abs(np.fft.rfft(signal - signal.mean())) ** 2
        believed = np.ones(len(power), dtype=bool)
        believed[0] = False
        for line in lines:
            low = int(np.floor((line.frequency_hz - line.half_width_hz) * duration_s))
            high = int(np.ceil((line.frequency_hz + line.half_width_hz) * duration_s))
            believed[max(low, 0) : high + 1] = False
        return cls(power, believed, duration_s)

    def filled(self) -> Real:
        """(bins,) power with gaps bridged by straight lines between means of what is beside."""
        power = self.power.copy()
        edges = np.flatnonzero(np.diff(np.concatenate([[True], self.believed, [True]]).astype(int)))
        for start, stop in zip(edges[::2], edges[1::2], strict=True):
            below = self._mean_of(max(0, start - _FILL_BINS), start)
            above = self._mean_of(stop, stop + _FILL_BINS)
            below, above = (below or above), (above or below)
            power[start:stop] = np.linspace(below, above, stop - start)
        return power

    def _mean_of(self, start: int, stop: int) -> float:
        kept = self.power[start:stop][self.believed[start:stop]]
        return float(kept.mean()) if len(kept) else 0.0

    def zone(self, low_hz: float, high_hz: float, most_bins: int) -> Zone | None:
        """Believed bins between two frequencies, averaged in groups where there are many.

        None where hardly anything is left.
        """
        first = max(1, int(np.ceil(low_hz * self.duration_s)))
        last = min(len(self.power) - 1, int(high_hz * self.duration_s) + 1)
        bins = first + np.flatnonzero(self.believed[first:last])
        if len(bins) < 16:
            return None
        size = max(1, len(bins) // most_bins)
        starts = np.arange(0, len(bins), size)
        weight = np.diff(np.append(starts, len(bins))).astype(float)
        frequency_hz = np.add.reduceat(bins, starts) / weight * self.step_hz
        power = np.add.reduceat(self.power[bins], starts) / weight
        return Zone(frequency_hz, np.maximum(power, 1e-300), weight, self.duration_s)
