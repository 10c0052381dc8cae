"""Find frames that were lost without a word, by comparing their number with the clock."""

from __future__ import annotations

import time

WINDOW_S = 1.0
SETTLING_S = 1.0
CATCH_UP_S = 0.5
"""After a silence, the frames that waited somewhere get so long to arrive."""
LONG_SILENCE_S = 0.2
LEAST_LOSS_S = 0.05
DRIFT = 5e-4
"""Most that a sound card's clock runs slow (common practice, no source: cards keep within 1e-4)."""

_CLOCK = getattr(time, "CLOCK_BOOTTIME", None)


def now_s() -> float:
    """Seconds on a clock that never jumps, and runs on while the computer sleeps."""
    if _CLOCK is not None:
        return time.clock_gettime(_CLOCK)
    return time.monotonic()


class FrameClock:
    """How far the frames lag behind the clock.

    Frames arrive late for many reasons, but lost ones never come: the least lag within a window
    steps up, and is no less in the next one. The base it is compared with may rise by no more than
    a clock's drift.
    """

    def __init__(self, rate_hz: float) -> None:
        self._rate_hz = rate_hz
        self.begin_anew()

    def begin_anew(self) -> None:
        """Forget everything; what lies before is no longer compared with."""
        self._frames = 0
        self._start_s: float | None = None
        self._last_s = 0.0
        self._base_s: float | None = None
        self._least_s = float("inf")
        self._window_end_s = 0.0
        self._whole_frames = 0
        self._suspected = False

    def lag_s(self, at_s: float) -> float:
        """Seconds of frames that are missing beside the clock, over the base; 0 before it is
        known."""
        if self._start_s is None or self._base_s is None:
            return 0.0
        return at_s - self._start_s - self._frames / self._rate_hz - self._base_s

    def feed(self, at_s: float, frames: int) -> tuple[int, int] | None:
        """Count frames that arrived at a time.

        Where some must have been lost: how many, and within how many of the last frames.
        """
        if self._start_s is None:
            self._start_s = at_s
            self._window_end_s = at_s + SETTLING_S
        elif at_s - self._last_s > LONG_SILENCE_S:
            self._window_end_s = max(self._window_end_s, at_s + CATCH_UP_S)
        self._last_s = at_s
        self._frames += frames
        lag_s = at_s - self._start_s - self._frames / self._rate_hz
        self._least_s = min(self._least_s, lag_s)
        if self._base_s is None or lag_s < self._base_s + LEAST_LOSS_S / 2:
            self._whole_frames = self._frames
        return self._close_window(at_s) if at_s >= self._window_end_s else None

    def _close_window(self, at_s: float) -> tuple[int, int] | None:
        least_s, self._least_s = self._least_s, float("inf")
        self._window_end_s = at_s + WINDOW_S
        if self._base_s is None:
            self._base_s = least_s
            return None
        risen_s = least_s - self._base_s
        if risen_s < LEAST_LOSS_S:
            self._base_s = min(least_s, self._base_s + DRIFT * WINDOW_S)
            self._suspected = False
            return None
        self._suspected = not self._suspected
        if self._suspected:
            return None
        self._base_s = least_s
        within, self._whole_frames = self._frames - self._whole_frames, self._frames
        return round(risen_s * self._rate_hz), within
