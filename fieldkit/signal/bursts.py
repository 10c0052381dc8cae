"""Bursts of noise that are no blow: a hand on the sensor, a dragged cable, a passing truck.

A blow surprises the predictor for as long as its contact lasts, and what rings after it is
foreseen. Noise surprises it for as long as it is loud.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.prediction import Errors

Real = NDArray[np.float64]

_BLOCK_S = 0.008
_FIRST_S = 0.4
_LAST_S = 0.6
_QUIET_SHARE = 0.25
_OVER_QUIET = 4.0
_VISIBLE = 20.0
_LONGEST_S = 0.06
"""Longer than two contacts of a double blow."""
_FINE_RATE_HZ = 400.0


def is_burst(scales: Sequence[Errors], at_s: float) -> bool:
    """True where prediction fails for long at the fine levels, two of which must see anything.

    The coarse ones smear a contact. In doubt it is a blow: one that is left out would spoil the
    background.
    """
    fine = [errors for errors in scales if errors.rate_hz >= _FINE_RATE_HZ]
    durations = [
        duration_s - errors.order / errors.rate_hz
        for errors in fine
        if (duration_s := unforeseen_s(errors, at_s)) is not None
    ]
    return len(durations) > 1 and float(np.median(durations)) > _LONGEST_S


def unforeseen_s(errors: Errors, at_s: float) -> float | None:
    """How long prediction fails about a time; None where it does not stand out there.

    The time over which the energy of the error is spread: its sum squared over the sum of its
    squares.
    """
    block = max(round(_BLOCK_S * errors.rate_hz), 1)
    raw = errors.raw[errors.between(at_s - _FIRST_S, at_s + _LAST_S)]
    count = len(raw) // block
    if count < 8:
        return None
    energy = np.sum(raw[: count * block].reshape(count, block) ** 2, axis=1)
    quiet = float(np.quantile(energy, _QUIET_SHARE))
    if energy.max() <= _VISIBLE * quiet:
        return None
    over = np.maximum(energy - _OVER_QUIET * quiet, 0.0) / energy.max()
    return float(np.sum(over) ** 2 / np.sum(over**2) * block / errors.rate_hz)
