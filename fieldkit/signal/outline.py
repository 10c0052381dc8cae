"""The outline of a long recording, for looking at."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.source import RecordingSource

MOST_POINTS = 2**22
"""32 MiB: one and a half minutes at 48 kHz, sample by sample."""
_BLOCK_SAMPLES = 2**18


def outline(
    source: RecordingSource, channel: int, most_points: int = MOST_POINTS
) -> NDArray[np.float64]:
    """Lowest and highest sample of even stretches of one channel, by turns, over its whole length.

    Returns (m,) with m at most ``most_points``; the samples themselves where there are no more.
    """
    if source.frames <= most_points:
        return source.stretch(channel, 0, source.frames)
    span = -(-2 * source.frames // most_points)
    blocks = source.blocks(channel, max(_BLOCK_SAMPLES // span, 1) * span)
    return np.concatenate([_extremes(block, span) for block in blocks])


def _extremes(block: NDArray[np.float64], span: int) -> NDArray[np.float64]:
    rows = np.pad(block, (0, -len(block) % span), mode="edge").reshape(-1, span)
    return np.stack([rows.min(axis=1), rows.max(axis=1)], axis=1).ravel()
