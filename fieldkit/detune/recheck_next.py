"""Which measurement would settle a recheck."""

from __future__ import annotations

import numpy as np

from fieldkit.detune.excitation import Goal
from fieldkit.detune.recheck_verdict import Judged, Now


def measure_next(now: Now, found: Judged, goal: Goal) -> str:
    """What to tap so that the question can be answered."""
    unseen = [m for m in found.modes if m.measured_hz is None and m.chance_clear < goal.chance]
    if now.stray and found.stray_in_band:
        peaks = ", ".join(f"{mode.frequency_hz:.1f} Hz" for mode in now.stray)
        return (
            f"move the sensor along the pipe and tap again: whether {peaks} grows and shrinks "
            "along it tells if it is this pipe"
        )
    if unseen:
        worst = min(unseen, key=lambda mode: mode.chance_clear)
        return (
            f"tap in {worst.direction} direction, with the sensor beside the blow, away from the "
            f"supports: the mode expected near {_as_tapped(now, worst.median_hz):.0f} Hz was not "
            "seen"
        )
    if not now.same_state:
        return (
            "tap the pipe as it runs, full and warm, with the machine stopped: the frequency then "
            "counts as it is"
        )
    return "tap again, five blows or more in each direction, the sensor where the mode moves most"


def _as_tapped(now: Now, running_hz: float) -> float:
    """About where a mode that runs there is found in the state of the re-tap."""
    medians = np.median(now.running.frequency_hz, axis=0)
    label = int(np.argmin(np.abs(medians - running_hz)))
    return float(np.median(now.tapped.frequency_hz[:, label]))
