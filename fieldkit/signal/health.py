"""Whether a record can be trusted: clipping, offset, drift, level that changes."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.clipping import clipped_at

_LEVEL_RATIO = 1.5
SHARES = 4


def clipping(signal: NDArray[np.float64], full_scale: float | None = None) -> tuple[str, ...]:
    """A warning where a signal (n,) rests on a rail, at its full scale or below it."""
    return clipping_warning(len(clipped_at(signal, full_scale)))


def clipping_warning(count: int) -> tuple[str, ...]:
    """What is said of so many samples at a rail."""
    if not count:
        return ()
    return (
        f"the recording is clipped in {count} samples: levels read low and lines are added that "
        "are not there; lower the gain and record again",
    )


def offset_and_drift(
    signal: NDArray[np.float64],
) -> tuple[NDArray[np.float64], tuple[str, ...]]:
    """The signal (n,) without mean and straight-line drift, and warnings where they are large."""
    x = np.linspace(-1.0, 1.0, len(signal))
    mean = float(signal.mean())
    slope = float(x @ signal / (x @ x))
    vibration = signal - mean - slope * x
    rms = float(np.sqrt(np.mean(vibration**2)))
    return vibration, offset_warnings(mean, slope, rms)


def offset_warnings(mean: float, slope: float, rms: float) -> tuple[str, ...]:
    """What is said of an offset and of a drift, by ``slope`` over half the record, against the RMS
    of the vibration."""
    warnings = []
    if abs(mean) > rms:
        warnings.append(
            f"a constant offset of {_times(abs(mean), rms)} the vibration was removed: gravity on "
            "a sensor that measures down to 0 Hz, or a wrong bias of sensor or input"
        )
    if abs(slope) > rms:
        warnings.append(
            f"a drift over {_times(2 * abs(slope), rms)} the vibration was removed: let sensor and "
            "input settle for a minute before recording"
        )
    return tuple(warnings)


def _times(value: float, rms: float) -> str:
    return f"{value / rms:.2g} times" if value < 1000 * rms else "over 1000 times"


def unsteady_level(vibration: NDArray[np.float64]) -> tuple[str, ...]:
    """A warning where the RMS differs much between the four quarters of a record (n,)."""
    quarters = np.array_split(vibration, SHARES)
    return level_warning([float(np.sqrt(np.mean(quarter**2))) for quarter in quarters])


def level_warning(levels: Sequence[float]) -> tuple[str, ...]:
    """What is said of the RMS of the four quarters of a record."""
    if max(levels) <= _LEVEL_RATIO * min(levels):
        return ()
    ratio = f"{max(levels) / min(levels):.2g} to 1" if min(levels) > 0 else "silent in part"
    return (
        f"the level changes during the recording ({ratio} between its quarters): the lines are an "
        "average; record while the machine runs steadily",
    )
