"""The last seconds of a source, kept in memory."""

from __future__ import annotations

import threading

import numpy as np

from fieldkit.capture.source import Block, Samples


class Ring:
    """Frames without a gap between them: a loss empties it. One thread feeds, any may read."""

    def __init__(self, *, frames: int, channels: int) -> None:
        self._kept = np.zeros((frames, channels), np.float32)
        self._held = 0
        self._next_frame = 0
        self._lock = threading.Lock()

    def feed(self, block: Block) -> None:
        """Take a block in, and let the oldest frames go."""
        size = len(self._kept)
        samples = block.samples[-size:]
        end = block.first_frame + len(block.samples)
        at = (end - len(samples) + np.arange(len(samples))) % size
        with self._lock:
            if block.lost_frames != 0:
                self._held = 0
            self._kept[at] = samples
            self._held = min(size, self._held + len(block.samples))
            self._next_frame = end

    def latest(self, frames: int | None = None) -> tuple[int, Samples]:
        """The number of the first frame and a copy (n, channels) of the last frames, oldest first.

        Fewer than asked for where fewer are held.
        """
        with self._lock:
            count = self._held if frames is None else max(0, min(frames, self._held))
            first = self._next_frame - count
            return first, self._kept[(first + np.arange(count)) % len(self._kept)]
