"""The height of a known decay in a recording: a mode's envelope to draw over a tap."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

BLOCKS = 40
ABOVE_REST = 3.0
"""Blocks whose largest sample is not this many times the last one's are rest, not ringing."""


def decay_height(samples: Array, rate_hz: float, decay_per_s: float) -> float | None:
    """Height at the first sample of ``h exp(-decay_per_s t)`` on the crests of a free decay.

    ``samples`` is (n,). The median over stretches of the largest sample carried back to the
    start; what has died away has no say. None where nothing rings.
    """
    if len(samples) < BLOCKS or decay_per_s <= 0:
        return None
    size = len(samples) // BLOCKS
    crest = np.abs(samples[: size * BLOCKS]).reshape(BLOCKS, size)
    largest, where = crest.max(axis=1), crest.argmax(axis=1) + size * np.arange(BLOCKS)
    ringing = largest > ABOVE_REST * largest[-1]
    if not ringing.any():
        ringing = largest > 0
    if not ringing.any():
        return None
    return float(np.median((largest * np.exp(decay_per_s * where / rate_hz))[ringing]))
