"""How many times a mode multiplies the deflection that a steady force would cause at rest.

|X/X_static| = 1 / sqrt((1 - r^2)^2 + (2 zeta r)^2) with r = forcing over natural frequency:
Thomson, Theory of Vibration with Applications, harmonically excited vibration (from memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]

DRAWS = 4000
SEED = 11
LOW, HIGH = 0.05, 0.95


def magnification(ratio: ArrayLike, damping_ratio: ArrayLike) -> Array:
    """Of displacement, single mode, elementwise; ``ratio`` is forcing over natural frequency."""
    r, zeta = np.asarray(ratio, dtype=float), np.asarray(damping_ratio, dtype=float)
    return np.asarray(1 / np.sqrt((1 - r**2) ** 2 + (2 * zeta * r) ** 2))


@dataclass(frozen=True)
class Doubtful:
    """A positive value with its doubt, log-normal."""

    median: float
    sd_ln: float

    @classmethod
    def between(cls, low: float, high: float) -> Doubtful:
        """From its 5 % and 95 % points."""
        return cls(float(np.sqrt(low * high)), float(np.log(high / low) / (2 * 1.6449)))

    @classmethod
    def about(cls, value: float, sd: float) -> Doubtful:
        """From a value and its standard deviation."""
        return cls(value, sd / value)

    @property
    def low(self) -> float:
        """5 %."""
        return float(self.median * np.exp(-1.6449 * self.sd_ln))

    @property
    def high(self) -> float:
        """95 %."""
        return float(self.median * np.exp(1.6449 * self.sd_ln))

    def draws(self, standard: Array) -> Array:
        """Values for standard-normal numbers."""
        return np.asarray(self.median * np.exp(self.sd_ln * standard))


@dataclass(frozen=True)
class Amplification:
    """What the doubts of line, mode and damping leave of the magnification."""

    best: float
    """At the best values of all three."""
    low: float
    """5 %."""
    high: float
    """95 %."""
    ratio: float
    """Line over mode."""
    apart: Array
    """(draws,) relative distance of the line from the mode."""

    def share_within(self, distance: float) -> float:
        """Chance that line and mode are no farther apart than this, relative."""
        return float(np.mean(self.apart <= distance))


def amplification(line: Doubtful, mode: Doubtful, damping: Doubtful) -> Amplification:
    """The magnification of a mode at a line, with the doubts carried through by fixed draws."""
    standard = np.random.default_rng(SEED).standard_normal((3, DRAWS))
    ratio = line.draws(standard[0]) / mode.draws(standard[1])
    times = magnification(ratio, damping.draws(standard[2]))
    low, high = np.quantile(times, (LOW, HIGH))
    at_best = line.median / mode.median
    best = float(magnification(at_best, damping.median))
    return Amplification(
        best,
        min(float(low), best),
        max(float(high), best),
        at_best,
        np.abs(1 / ratio - 1),
    )
