"""What shakes the pipe, and the frequency bands it makes forbidden."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

SAME_LINE = 0.02
"""A line this close to an excitation, relative, is its own: plates state speeds roughly."""


@dataclass(frozen=True)
class Excitation:
    """A machine with a speed range and orders, or a source at stated frequencies."""

    name: str
    speed_hz: tuple[float, float] | None = None
    """Lowest and highest shaft speed, revolutions per second."""
    orders: tuple[float, ...] = (1.0,)
    frequency_hz: tuple[float, float] | None = None
    """Lowest and highest frequency where no speed is given."""

    def ranges(self) -> list[tuple[str, float, float]]:
        """(name, low_hz, high_hz) of each order, or of the stated frequencies."""
        if self.frequency_hz is not None:
            return [(self.name, *self.frequency_hz)]
        low, high = self.speed_hz or (0.0, 0.0)
        return [(f"{self.name} {order:g}x", low * order, high * order) for order in self.orders]


@dataclass(frozen=True)
class Band:
    """An excitation widened by the separation margin."""

    name: str
    low_hz: float
    high_hz: float
    avoid_low_hz: float
    avoid_high_hz: float

    def holds(self, frequency_hz: float) -> bool:
        """Whether a mode at this frequency is too close to the excitation."""
        return self.avoid_low_hz <= frequency_hz <= self.avoid_high_hz

    def separation(self, frequency_hz: float) -> float:
        """Relative distance of a frequency from the excitation; 0 inside it."""
        if frequency_hz < self.low_hz:
            return 1 - frequency_hz / self.low_hz
        return max(0.0, frequency_hz / self.high_hz - 1)


def bands(excitations: Iterable[Excitation], margin: float) -> tuple[Band, ...]:
    """Forbidden bands in rising order; ``margin`` is relative (0.2 keeps 20 % away)."""
    found = [
        Band(name, low, high, low * (1 - margin), high * (1 + margin))
        for excitation in excitations
        for name, low, high in excitation.ranges()
    ]
    return tuple(sorted(found, key=lambda band: (band.low_hz, band.high_hz)))


def excitation_band(frequency_hz: float, forbidden: Sequence[Band]) -> Band | None:
    """The excitation a running line belongs to: its range holds it, or ends within 2 % of it."""
    close = [band for band in forbidden if band.separation(frequency_hz) <= SAME_LINE]
    return min(close, key=lambda band: band.separation(frequency_hz), default=None)


def clear_of_all(frequency_hz: NDArray[np.float64], forbidden: Sequence[Band]) -> NDArray[np.bool_]:
    """Elementwise: whether a frequency lies outside every band; same shape as the input."""
    clear = np.ones(np.shape(frequency_hz), dtype=bool)
    for band in forbidden:
        clear &= (frequency_hz < band.avoid_low_hz) | (frequency_hz > band.avoid_high_hz)
    return clear


@dataclass(frozen=True)
class Goal:
    """What a cure must reach."""

    margin: float = 0.2
    """Separation of a predicted frequency, relative."""
    margin_measured: float = 0.1
    chance: float = 0.9
    up_to_hz: float = 200.0
    allow: tuple[str, ...] = ("support", "move", "stiffen", "mass", "speed", "absorber")
    keep_out_m: tuple[tuple[float, float], ...] = ()
    """Stations where nothing can be attached."""
    steel_m: tuple[tuple[float, float], ...] = ()
    """Stations beside steel or concrete that a bracket can stand on."""

    def steel_near(self, at_m: float | None) -> bool:
        """Whether the job names something to stand a bracket on at a station."""
        return at_m is not None and any(low <= at_m <= high for low, high in self.steel_m)

    def may_attach(self, at_m: float) -> bool:
        """Whether a station lies outside every keep-out."""
        return not any(low <= at_m <= high for low, high in self.keep_out_m)
