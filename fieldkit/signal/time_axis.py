"""Sampling times as written in a file, and samples on an even grid from them."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import InputError, Place

LONGEST_STEP = 3.0
"""In median steps; across a longer gap a signal is not known well enough to be resampled."""
EVEN_WITHIN = 0.01
"""Of a step: times this close to an even grid are even, whatever their digits say."""


_ROWS_AT_ONCE = 2**18


@dataclass(frozen=True)
class EvenSamples:
    """Samples at a constant rate."""

    samples: NDArray[np.float64]
    """(n, channels)"""
    rate_hz: float
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class SamplingTimes:
    """One time for each row of a table."""

    seconds: NDArray[np.float64]
    """(n,)"""
    resolution_s: NDArray[np.float64]
    """(n,) what the last digit written stands for."""
    lines: range | NDArray[np.int32]
    """(n,) line of each row in the file."""
    path: Path

    def place(self, row: int) -> Place:
        """Where a row stands."""
        return Place(self.path, int(self.lines[row]))


def rises_evenly(seconds: NDArray[np.float64]) -> bool:
    """Whether a column looks like time: nine of ten steps are alike and go up."""
    if len(seconds) < 3:
        return False
    steps = np.diff(seconds)
    median = float(np.median(steps))
    return median > 0 and float(np.mean(np.abs(steps - median) <= 0.5 * median)) >= 0.9


def even_samples(
    times: SamplingTimes, samples: NDArray[np.float64], stated_hz: float | None = None
) -> EvenSamples:
    """Samples (n, channels) at a constant rate, resampled where their times are uneven.

    Times that differ from an even grid by no more than their last digit are even. A stated rate
    stands in for times too coarse to tell the samples apart. Raises InputError with the line
    where time runs backwards, repeats, or jumps too far.
    """
    _check_forward(times)
    if stated_hz is not None and _on_grid(times, 1.0 / stated_hz):
        return EvenSamples(samples, stated_hz)
    _check_no_repeat(times)
    rate_hz = _grid_rate(times)
    if rate_hz is not None:
        return EvenSamples(samples, rate_hz)
    _check_no_gap(times)
    return _resampled(times, samples)


def mean_rate(seconds: NDArray[np.float64]) -> float:
    """Samples per second from the first time to the last; infinite where no time passes."""
    passed_s = float(seconds[-1] - seconds[0])
    return (len(seconds) - 1) / passed_s if passed_s > 0 else float("inf")


def _check_forward(times: SamplingTimes) -> None:
    backward = np.flatnonzero(np.diff(times.seconds) < 0)
    if backward.size:
        row = int(backward[0]) + 1
        before, after = times.seconds[row - 1 : row + 1] - times.seconds[0]
        raise InputError(
            f"time runs backwards, from {before:.9g} s to {after:.9g} s after the first row",
            "give the rows in the order they were measured, one recording to a file",
            times.place(row),
        )


def _check_no_repeat(times: SamplingTimes) -> None:
    repeated = np.flatnonzero(np.diff(times.seconds) == 0)
    if repeated.size:
        row = int(repeated[0]) + 1
        raise InputError(
            "the time is the same as in the row before",
            "export times with more digits, or state the sampling rate",
            times.place(row),
        )


def _check_no_gap(times: SamplingTimes) -> None:
    steps = np.diff(times.seconds)
    median = float(np.median(steps))
    row = int(np.argmax(steps)) + 1
    longest = float(steps[row - 1])
    if longest > LONGEST_STEP * median:
        raise InputError(
            f"a gap of {1e3 * longest:.4g} ms in the recording, where a step is "
            f"{1e3 * median:.4g} ms",
            "cut the recording there and use the longer part",
            times.place(row),
        )


def _on_grid(times: SamplingTimes, step_s: float) -> bool:
    """Whether the times are those of even samples a step apart, as far as their digits tell."""
    parts = [
        slice(first, first + _ROWS_AT_ONCE) for first in range(0, len(times.seconds), _ROWS_AT_ONCE)
    ]
    lowest = min(float(_offset(times, step_s, part).min()) for part in parts)
    highest = max(float(_offset(times, step_s, part).max()) for part in parts)
    middle = (highest + lowest) / 2
    return all(
        np.all(np.abs(_offset(times, step_s, part) - middle) <= _tolerance(times, step_s, part))
        for part in parts
    )


def _offset(times: SamplingTimes, step_s: float, part: slice) -> NDArray[np.float64]:
    """Times of a part of the rows less those of an even grid from zero."""
    seconds = times.seconds[part]
    return np.asarray(seconds - step_s * np.arange(part.start, part.start + len(seconds)))


def _tolerance(times: SamplingTimes, step_s: float, part: slice) -> NDArray[np.float64]:
    return np.maximum(1.01 * times.resolution_s[part], EVEN_WITHIN * step_s)


def _grid_rate(times: SamplingTimes) -> float | None:
    """Rate of the even grid through the times; None where there is none.

    The least-squares step, or the step of a whole number of hertz where that fits as well.
    """
    index = np.arange(len(times.seconds)) - (len(times.seconds) - 1) / 2
    step_s = float(index @ (times.seconds - times.seconds[0]) / (index @ index))
    for rate_hz in (float(round(1 / step_s)), 1 / step_s):
        if rate_hz > 0 and _on_grid(times, 1 / rate_hz):
            return rate_hz
    return None


def _resampled(times: SamplingTimes, samples: NDArray[np.float64]) -> EvenSamples:
    from scipy.interpolate import CubicSpline

    seconds = times.seconds - times.seconds[0]
    steps = np.diff(seconds)
    step_s = float(np.median(steps))
    grid = step_s * np.arange(int(seconds[-1] / step_s * (1 + 1e-12)) + 1)
    note = (
        f"the samples were not evenly spaced: steps of {1e3 * steps.min():.4g} to "
        f"{1e3 * steps.max():.4g} ms, median {1e3 * step_s:.4g} ms; resampled at "
        f"{1 / step_s:.6g} Hz by cubic interpolation, which keeps levels better than linear; "
        f"do not rely on anything above {0.2 / step_s:.4g} Hz"
    )
    return EvenSamples(CubicSpline(seconds, samples)(grid), 1 / step_s, (note,))
