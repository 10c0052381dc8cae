"""Modes of one running recording, or why it shows none."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import Refusal
from fieldkit.job.document import RecordingEntry
from fieldkit.signal.modes import ModeEstimate
from fieldkit.signal.running_modes import estimate_running_modes
from fieldkit.signal.steady_lines import RunningLine
from fieldkit.workup.limits import LEAST_HZ, NYQUIST_SHARE

LONGEST_S = 600.0
"""More of a record costs time and memory and narrows little."""
NO_MODE = (
    "no natural frequency stands out of the running vibration: record two minutes or more, or tap"
)


def running_modes(
    signal: NDArray[np.float64],
    rate_hz: float,
    lines: Sequence[RunningLine],
    entry: RecordingEntry,
    up_to_hz: float,
) -> tuple[ModeEstimate | None, str]:
    """What a running channel (n,) tells of modes, and the reason where it tells nothing."""
    kept = signal[: int(LONGEST_S * rate_hz)]
    highest_hz = min(up_to_hz, NYQUIST_SHARE * rate_hz)
    try:
        found = estimate_running_modes(
            kept, rate_hz, low_hz=LEAST_HZ, high_hz=highest_hz, lines=lines
        )
    except Refusal as refusal:
        return None, str(refusal)
    modes = tuple(
        replace(mode, direction=entry.direction, state=entry.state, at_m=entry.at_m)
        for mode in found.modes
    )
    return replace(found, modes=modes), "" if modes else NO_MODE
