"""How well computed modes explain measured peaks, without assuming which peak is which mode.

Peaks and modes of one sensor direction are aligned in order of frequency; a mode may have been
missed and a peak may be false. The likelihood sums over every order-preserving alignment by the
forward recursion of a pair hidden Markov model (Durbin, Eddy, Krogh and Mitchison 1998, Biological
Sequence Analysis, chapter 4, from memory), and the forward-backward recursion gives the
probability that a peak belongs to a mode.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

MODEL_ERROR = 0.008
"""Relative error of a computed frequency that no parameter accounts for (common practice)."""
FALSE_PEAK_RATE = 0.06
"""How often a clear peak belongs to no mode of the span."""
DOUBTFUL_PEAK_RATE = 0.5
"""The same for a faint or heavily damped one: leftovers of hum and contact look like that."""
RUNNING_MODEL_ERROR = 0.02
"""The same as MODEL_ERROR for a peak found while running: how full and how warm the line was then,
and which way a support with play was pressed, is known less well (common practice, no source)."""
RUNNING_FALSE_RATE = 0.25
"""A peak found while running is more often none of the span: neighbours and flow shake it too."""
RUNNING_DETECTION = 0.6
"""Share of the modes that a tap would show which the forces of running show too."""
LEAST_DETECTION = 0.06
"""A mode of the other plane still shows this often: no sensor is perfectly aligned."""
MOST_DETECTION = 0.95
NEVER = -1e30


@dataclass(frozen=True)
class Peaks:
    """Measured peaks that one sensor direction saw in one state, in rising frequency."""

    frequency_hz: Array
    """(peaks,)"""
    sd_hz: Array
    direction: str | None
    state: str
    highest_hz: float
    """Modes above were not looked for."""
    false_rate: Array
    """(peaks,) how often such a peak belongs to no mode."""
    model_error: float = MODEL_ERROR
    """Relative, what no parameter accounts for."""
    shown: float = 1.0
    """How often a mode shows that a tap would show."""
    weight: float = 1.0
    """Power to which the likelihood of these peaks is taken: below one where others say more."""


@dataclass(frozen=True)
class Alignment:
    """Log-likelihood (members,) and responsibilities (members, peaks, modes)."""

    log_likelihood: Array
    responsibility: Array


def detection(
    seen_share: Array, frequency_hz: Array, highest_hz: float, shown: float = 1.0
) -> Array:
    """Chance that a mode shows as a peak, from the share of its motion the sensor can see.

    ``shown`` is the chance with which it is shaken at all.
    """
    visible = LEAST_DETECTION + (MOST_DETECTION - LEAST_DETECTION) * np.clip(seen_share, 0, 1)
    looked_for = 1 / (1 + np.exp(np.clip((frequency_hz / highest_hz - 1) / 0.02, -50, 50)))
    return np.asarray(np.clip(shown * visible * looked_for, 1e-6, MOST_DETECTION))


def peak_variance(peaks: Peaks, frequency_hz: Array, widening: float) -> Array:
    """(members, peaks, modes) variance of a peak about a computed mode."""
    model = (peaks.model_error * frequency_hz[:, None, :]) ** 2
    return np.asarray(widening**2 * (peaks.sd_hz[None, :, None] ** 2 + model))


def align(
    peaks: Peaks, frequency_hz: Array, detected: Array, *, widening: float = 1.0
) -> Alignment:
    """Sum over all alignments of ``peaks`` with modes ``frequency_hz`` (members, modes).

    ``detected`` (members, modes) is the chance of each mode to show; ``widening`` multiplies the
    peak widths, for annealing.
    """
    match, missed, false = _logs(peaks, frequency_hz, detected, widening)
    forward = _forward(match, missed, false)
    backward = _forward(match[:, ::-1, ::-1], missed[:, ::-1], false[::-1])[:, ::-1, ::-1]
    total = forward[:, -1, -1]
    through = forward[:, :-1, :-1] + match + backward[:, 1:, 1:] - total[:, None, None]
    return Alignment(total, np.exp(np.minimum(through, 0.0)))


def log_likelihood(peaks: Peaks, frequency_hz: Array, detected: Array) -> Array:
    """(members,) the likelihood of ``align`` alone, in half its time."""
    return np.asarray(_forward(*_logs(peaks, frequency_hz, detected, 1.0))[:, -1, -1])


def _logs(
    peaks: Peaks, frequency_hz: Array, detected: Array, widening: float
) -> tuple[Array, Array, Array]:
    """What a match, a missed mode and a false peak cost."""
    match = _log_match(peaks, frequency_hz, detected, widening)
    return match, np.log1p(-detected), np.log(peaks.false_rate / peaks.highest_hz)


def _log_match(peaks: Peaks, frequency_hz: Array, detected: Array, widening: float) -> Array:
    variance = peak_variance(peaks, frequency_hz, widening)
    misfit = peaks.frequency_hz[None, :, None] - frequency_hz[:, None, :]
    density = -0.5 * misfit**2 / variance - 0.5 * np.log(2 * np.pi * variance)
    return np.asarray(density + np.log(detected)[:, None, :])


def _forward(match: Array, missed: Array, false: Array) -> Array:
    """(members, peaks + 1, modes + 1) log-sum over alignments of the first peaks and modes.

    Between two matches the false peaks are taken before the missed modes, so that each alignment
    counts once: ``skipped`` holds those that end in a missed mode, ``settled`` the others.
    """
    members, peaks, modes = match.shape
    settled = np.full((members, peaks + 1, modes + 1), NEVER)
    skipped = np.full_like(settled, NEVER)
    both = np.full_like(settled, NEVER)
    settled[:, 0, 0] = both[:, 0, 0] = 0.0
    for i in range(peaks + 1):
        for n in range(modes + 1):
            if n > 0:
                skipped[:, i, n] = both[:, i, n - 1] + missed[:, n - 1]
            if i > 0:
                settled[:, i, n] = settled[:, i - 1, n] + false[i - 1]
            if i > 0 and n > 0:
                taken = both[:, i - 1, n - 1] + match[:, i - 1, n - 1]
                settled[:, i, n] = np.logaddexp(settled[:, i, n], taken)
            both[:, i, n] = np.logaddexp(settled[:, i, n], skipped[:, i, n])
    return both
