"""Where blows begin."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.innovation import Innovation, Level, innovations

Real = NDArray[np.float64]
Indices = NDArray[np.intp]

FALSE_PER_RECORDING = 1e-3
_OVER_CHANCE = 4.0
"""Room for noise with heavier tails than a normal distribution."""
_OVER_BEFORE = 30.0
"""Energy over that of the 10 to 30 ms before."""
_OVER_JUST_BEFORE = 8.0
"""Energy over the highest of the 10 ms before."""
_OVER_STRONGEST = 2.5e-3
"""Energy over that of the strongest blow."""
_ONE_CONTACT_S = 0.008


@dataclass(frozen=True)
class Onset:
    """A sudden rise: the start of a blow, or of a rebound."""

    at_s: float
    strength: float
    """Amplitude of the innovation over its median."""
    scale: int
    """0 for the finest level."""
    rise_s: float = 0.0
    """How long a soft one takes to reach its height; 0 for a sudden one."""


def onsets(scales: Sequence[Level]) -> list[Onset]:
    """All sudden rises that prediction from the past does not explain, in order of time."""
    found: list[Onset] = []
    for scale, level in enumerate(innovations(scales)):
        guard_s = 4 * level.block_s + level.order_s
        for onset in onsets_of_scale(level, scale):
            if all(abs(onset.at_s - f.at_s) > guard_s for f in found):
                found.append(onset)
    return sorted(found, key=lambda f: f.at_s)


def onsets_of_scale(level: Innovation, scale: int) -> list[Onset]:
    """Onsets at one scale; what follows within a contact and the predictor's memory is its part."""
    energy = level.energy
    least = max(chance_level(len(energy)), _OVER_STRONGEST * float(energy.max()))
    at = np.flatnonzero(energy > least)
    peak = highest_ahead(energy, level.block_s, at)
    sudden = peak > _OVER_JUST_BEFORE * highest_before(energy, level.block_s, at)
    at, peak = at[sudden], peak[sudden]
    rising = peak > _OVER_BEFORE * before(energy, level.block_s, at)
    found: list[Onset] = []
    for i, height in zip(at[rising], peak[rising], strict=True):
        at_s = float(i * level.block_s)
        if not found or at_s - found[-1].at_s > _ONE_CONTACT_S + level.order_s:
            found.append(Onset(at_s, float(np.sqrt(height)), scale))
    return found


def chance_level(blocks: int) -> float:
    """Energy over its median that noise passes in one recording of a thousand, with room."""
    from scipy.special import chdtri

    degrees = 4.0
    extreme = float(chdtri(degrees, FALSE_PER_RECORDING / max(blocks, 1)))
    return _OVER_CHANCE * extreme / float(chdtri(degrees, 0.5))


def before(energy: Real, block_s: float, at: Indices) -> Real:
    """Median energy of the 30 to 5 ms before some blocks (two blocks at least), never below 1."""
    width = max(round(0.025 / block_s), 3)
    gap = max(round(0.005 / block_s), 1)
    middle = np.maximum(at - gap - width // 2, 0)
    ranked = np.sort(windows(energy, middle - width // 2, width), axis=1)
    return np.asarray(np.maximum(ranked[:, width // 2], 1.0))


def highest_before(energy: Real, block_s: float, at: Indices) -> Real:
    """Highest energy of the 10 to 1.5 ms before some blocks (two blocks at least)."""
    width = max(round(0.0085 / block_s), 2)
    gap = max(round(0.0015 / block_s), 1)
    highest = windows(energy, at - gap - width + 1, width).max(axis=1, initial=0.0)
    return np.where(at < gap, 1.0, highest)


def highest_ahead(energy: Real, block_s: float, at: Indices) -> Real:
    """Highest energy from some blocks to one contact later (two blocks at least)."""
    width = max(round(_ONE_CONTACT_S / block_s), 2)
    return np.asarray(windows(energy, at, width).max(axis=1, initial=0.0))


def windows(energy: Real, first: Indices, width: int) -> Real:
    """(n, width) energies from some blocks on; beyond the ends stand the outermost."""
    where = np.clip(first[:, None] + np.arange(width), 0, len(energy) - 1)
    return np.asarray(energy[where])
