"""Whether a record can be trusted: clipping, offset, drift, level that changes."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

_RAIL_RUNS = 2
"""Runs of equal samples at an extreme that make it a rail."""
_RAIL_LENGTH = 3
_STEPS_INTO_RAIL = 4.0
"""A clipped signal arrives at its rail at speed: by this many of its finest steps."""
_NEAR_FULL_SCALE = 0.99
_LEVEL_RATIO = 1.5
_SHARES = 4


def clipping(signal: NDArray[np.float64], full_scale: float | None = None) -> tuple[str, ...]:
    """A warning where a signal (n,) rests on a rail: a known full scale, or a level of its own.

    A rail of its own is the highest or lowest value, held for three samples or more, more than
    once, and reached from further away than the finest step of the samples.
    """
    count = sum(_samples_on_rail(side * signal, full_scale) for side in (1.0, -1.0))
    if not count:
        return ()
    return (
        f"the recording is clipped in {count} samples: levels read low and lines are added that "
        "are not there; lower the gain and record again",
    )


def _samples_on_rail(signal: NDArray[np.float64], full_scale: float | None) -> int:
    top = float(signal.max())
    starts, ends = _runs(signal == top)
    lengths = ends - starts
    if full_scale is not None and top >= _NEAR_FULL_SCALE * full_scale:
        return int(lengths.sum()) if lengths.sum() >= _RAIL_RUNS else 0
    held = lengths >= _RAIL_LENGTH
    before = starts[held & (starts > 0)] - 1
    if len(before) < _RAIL_RUNS:
        return 0
    arrival = float(np.median(top - signal[before]))
    return int(lengths[held].sum()) if arrival > _STEPS_INTO_RAIL * _finest_step(signal) else 0


def _runs(mask: NDArray[np.bool_]) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """Starts and ends (one past) of the runs of True."""
    true = np.flatnonzero(mask)
    breaks = np.flatnonzero(np.diff(true) > 1)
    return true[np.concatenate([[0], breaks + 1])], true[np.concatenate([breaks, [-1]])] + 1


def _finest_step(signal: NDArray[np.float64]) -> float:
    """Smallest difference between samples of different value, from a share of a long record."""
    values = np.unique(signal[:: max(1, len(signal) // 100_000)])
    return float(np.diff(values).min()) if len(values) > 1 else 0.0


def offset_and_drift(
    signal: NDArray[np.float64],
) -> tuple[NDArray[np.float64], tuple[str, ...]]:
    """The signal (n,) without mean and straight-line drift, and warnings where they are large."""
    x = np.linspace(-1.0, 1.0, len(signal))
    mean = float(signal.mean())
    slope = float(x @ signal / (x @ x))
    vibration = signal - mean - slope * x
    rms = float(np.sqrt(np.mean(vibration**2)))
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
    return vibration, tuple(warnings)


def _times(value: float, rms: float) -> str:
    return f"{value / rms:.2g} times" if value < 1000 * rms else "over 1000 times"


def unsteady_level(vibration: NDArray[np.float64]) -> tuple[str, ...]:
    """A warning where the RMS differs much between the four quarters of a record (n,)."""
    quarters = np.array_split(vibration, _SHARES)
    levels = [float(np.sqrt(np.mean(quarter**2))) for quarter in quarters]
    if max(levels) <= _LEVEL_RATIO * min(levels):
        return ()
    ratio = f"{max(levels) / min(levels):.2g} to 1" if min(levels) > 0 else "silent in part"
    return (
        f"the level changes during the recording ({ratio} between its quarters): the lines are an "
        "average; record while the machine runs steadily",
    )
