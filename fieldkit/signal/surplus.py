"""What the background holds just where a mode is claimed, beyond its smooth density.

A machine whose speed moves, or the ground, leaves a hump narrower than the window over which the
density is read and wider than a line. A mode found on it is judged by the density there.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from fieldkit.signal.background import NoiseDensity, periodograms
from fieldkit.signal.tones import WANDERING_WIDTH, Line
from fieldkit.signal.traces import Trace

_BY_CHANCE = 1e-3
_DIES_AWAY = 6.0
"""Power of the first half over that of the last where an earlier blow still rings."""
_LINE_BINS = 3.0
_BINS_PER_FREE = 1.5
"""Bins of a Hann periodogram for each that is independent (noise bandwidth of the window)."""


def background_surplus(
    quiet: Trace | None, lines: Sequence[Line], noise: NoiseDensity, at_hz: float, width_hz: float
) -> float:
    """Power of the background within a width of a frequency over that of ``noise``; at least 1.

    1 also where the background could show as much by chance, or is too short to tell what stands
    there from what stands beside it. Known lines are passed over. Where an
    earlier blow rings in it, its last half counts.
    """
    from scipy.special import chdtri

    if quiet is None or width_hz * quiet.duration_s < 1:
        return 1.0
    middle = len(quiet.samples) // 2
    halves = [replace(quiet, samples=s, spectra={}) for s in np.split(quiet.samples, [middle])]
    first, last = (excess(h, lines, noise, at_hz, width_hz)[0] for h in halves)
    used = halves[1] if first > _DIES_AWAY * last else quiet
    ratio, free = excess(used, lines, noise, at_hz, width_hz)
    return ratio if ratio > float(chdtri(free, _BY_CHANCE)) / free else 1.0


def excess(
    quiet: Trace, lines: Sequence[Line], noise: NoiseDensity, at_hz: float, width_hz: float
) -> tuple[float, float]:
    """Power of a stretch over the expected one, and degrees of freedom of their ratio."""
    count = quiet.fast_whole
    power = periodograms(quiet.samples[-count:], count, quiet.rate_hz)[0]
    spacing_hz = quiet.rate_hz / count
    reach = max(width_hz, spacing_hz)
    low, high = (at_hz - reach) / spacing_hz, (at_hz + reach) / spacing_hz
    bins = np.arange(max(int(np.ceil(low)), 1), min(int(high), len(power) - 1) + 1)
    for line in lines:
        wide_hz = WANDERING_WIDTH * line.resolution_hz if line.wanders else 0.0
        clear_hz = max(_LINE_BINS * spacing_hz, wide_hz)
        bins = bins[np.abs(bins * spacing_hz - line.frequency_hz) > clear_hz]
    if not len(bins):
        return 1.0, 2.0
    ratio = float(np.mean(power[bins] / noise.at(np.asarray(bins * spacing_hz, float))))
    return ratio, 2 * max(len(bins) / _BINS_PER_FREE, 1.0)
