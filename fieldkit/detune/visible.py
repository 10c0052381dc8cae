"""Which modes of an ensemble a sensor at a station would show."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.field import AXES, Field
from fieldkit.detune.likelihood import detection
from fieldkit.detune.tracking import follow, followed

Array = NDArray[np.float64]

FREE_HZ = 0.2
"""Below it a mode is a free direction of the model, not a vibration."""
LOW, HIGH = 0.05, 0.95


@dataclass(frozen=True)
class Followed:
    """The vibrating modes of one state up to a frequency, followed through the ensemble."""

    field: Field
    up_to_hz: float
    frequency_hz: Array
    """(members, modes)."""
    vector: Array
    """(members, r, modes)."""
    direction: tuple[str, ...]
    number: tuple[int, ...]
    """Place of each mode among the vibrating ones, from 1: what pairs are numbered by."""

    def interval(self, mode: int) -> tuple[float, float]:
        """5 and 95 % of the frequency of a mode."""
        low, high = np.quantile(self.frequency_hz[:, mode], (LOW, HIGH))
        return float(low), float(high)

    def shown(self, stations: Sequence[int], axis: str) -> Array:
        """(stations, modes) chance to show in a tap along ``axis`` beside the sensor there."""
        ports = [self.field.ports.of(axis, station) for station in stations]
        return np.stack([self._detected(port) for port in ports])

    def _detected(self, ports: NDArray[np.intp]) -> Array:
        moved = np.sum((self.field.ports.rows[ports] @ self.vector) ** 2, axis=1)
        share = np.sqrt(moved / np.maximum(self._mean_square, 1e-30))
        return np.asarray(detection(share, self.frequency_hz, self.up_to_hz).mean(axis=0))

    @property
    def _mean_square(self) -> Array:
        """(members, modes) squared motion, every direction, mean over the stations."""
        gram = sum(self.field.ports.motion_gram) / len(self.field.station_m)
        return np.asarray(np.sum(self.vector * (gram @ self.vector), axis=1))


def follow_modes(field: Field, up_to_hz: float) -> Followed:
    """Follow every mode that vibrates and whose median lies below the limit."""
    frequency, share = field.modes.frequency_hz, field.direction_share(field.modes.vector)
    central = field.central
    count = max(1, int(np.sum(frequency[central] < 1.3 * up_to_hz)))
    chosen = follow(frequency, share, frequency[central, :count], share[central, :count])
    tracked = followed(frequency, chosen)
    median = np.median(tracked, axis=0)
    kept = np.flatnonzero((median > FREE_HZ) & (median < up_to_hz))
    vector = np.take_along_axis(field.modes.vector, chosen[:, None, :], axis=2)
    return Followed(
        field,
        up_to_hz,
        tracked[:, kept],
        vector[:, :, kept],
        tuple(AXES[int(i)] for i in np.argmax(share[central, kept], axis=1)),
        tuple(int(np.sum(median[:j] > FREE_HZ)) + 1 for j in kept),
    )
