"""A stretch of a long recording at a lower rate, without holding it at its own."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fieldkit.progress import Progress
from fieldkit.signal.decimation import decimate, lowpass
from fieldkit.signal.source import RecordingSource

BLOCK_SAMPLES = 2**18


def decimated(
    source: RecordingSource,
    channel: int,
    *,
    keep_hz: float,
    wanted_rate_hz: float,
    progress: Progress | None = None,
) -> tuple[NDArray[np.float64], float]:
    """``decimate`` on one channel, read in blocks: samples (m,) and their rate.

    The same samples as from the whole, but for less than half a second at its end.
    """
    progress = progress or Progress()
    rate_hz = source.rate_hz
    step = int(rate_hz // wanted_rate_hz)
    if step < 2:
        return source.stretch(channel, 0, source.frames), rate_hz
    filter_taps = len(lowpass(rate_hz, keep_hz, rate_hz / step - keep_hz))
    overlap = -(-filter_taps // step) * step - step
    hop = max(BLOCK_SAMPLES, 4 * filter_taps) // step * step
    pieces: list[NDArray[np.float64]] = []
    for i, block in enumerate(source.blocks(channel, hop + overlap, overlap)):
        progress.step("lowering the rate", min(i * hop / source.frames, 1.0))
        if i == 0 or len(block) >= 4 * filter_taps:
            lowered, slow_hz = decimate(
                block, rate_hz, keep_hz=keep_hz, wanted_rate_hz=wanted_rate_hz
            )
            pieces.append(lowered)
    return np.concatenate(pieces), slow_hz
