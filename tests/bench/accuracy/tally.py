"""Many recordings counted together."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tests.bench.accuracy.scoring import FoundMode, Score

Real = NDArray[np.float64]

NORMAL_95 = 1.959964
_MEDIAN_TO_SD = 1.482602
_TRIMMED_SHARE = 0.95
_TRIMMED_RMS = 0.87080
"""RMS of a standard normal variable within its central 95 %."""


@dataclass(frozen=True)
class Tally:
    """Counts and ratios over recordings."""

    scores: tuple[Score, ...]

    @property
    def found(self) -> tuple[FoundMode, ...]:
        return tuple(mode for score in self.scores for mode in score.found)

    @property
    def both(self) -> tuple[FoundMode, ...]:
        """Modes that peak picking found too."""
        return tuple(mode for mode in self.found if mode.picked is not None)

    def sum(self, count: Callable[[Score], int]) -> int:
        return sum(map(count, self.scores))

    def share(self, part: Callable[[Score], int], whole: Callable[[Score], int]) -> float:
        """NaN where there is nothing to share."""
        total = self.sum(whole)
        return self.sum(part) / total if total else np.nan

    @property
    def false_per_record(self) -> float:
        return self.sum(lambda s: len(s.false_hz)) / max(len(self.scores), 1)

    @property
    def median_cpu_s(self) -> float:
        return float(np.median([s.cpu_s for s in self.scores]))

    @property
    def worst_cpu_s(self) -> float:
        return max(s.cpu_s for s in self.scores)

    @property
    def frequency_ratio(self) -> float:
        """Error over bound, from the median."""
        return robust(m.frequency_ratio for m in self.found)

    @property
    def damping_ratio(self) -> float:
        """Error over bound, from the median."""
        return robust(m.damping_ratio for m in self.found)

    @property
    def frequency_trimmed(self) -> float:
        """RMS error over bound without the largest twentieth."""
        return trimmed(m.frequency_ratio for m in self.found)

    @property
    def damping_trimmed(self) -> float:
        """RMS error over bound without the largest twentieth."""
        return trimmed(m.damping_ratio for m in self.found)

    @property
    def frequency_coverage(self) -> float:
        """Share of 95 % intervals that hold the truth."""
        return covered([m.frequency_score for m in self.found])

    @property
    def damping_coverage(self) -> float:
        """Share of log-normal 95 % intervals that hold the truth."""
        return covered([m.damping_score for m in self.found])

    @property
    def frequency_error(self) -> float:
        """Median relative error of the modes that peak picking found too."""
        return median(m.frequency_error_hz / m.true.frequency_hz for m in self.both)

    @property
    def picked_frequency_error(self) -> float:
        """The same of peak picking."""
        return median(
            (m.picked.frequency_hz - m.true.frequency_hz) / m.true.frequency_hz
            for m in self.both
            if m.picked
        )

    @property
    def damping_error(self) -> float:
        """Median relative error of damping of the modes that peak picking found too."""
        return median(np.expm1(m.damping_log_error) for m in self.both)

    @property
    def picked_damping_error(self) -> float:
        """The same of the half-power bandwidth."""
        return median(
            m.picked.damping_ratio / m.true.damping_ratio - 1 for m in self.both if m.picked
        )


def median(errors: Iterable[float]) -> float:
    """Median absolute value; NaN of nothing."""
    values = np.abs(list(errors))
    return float(np.median(values)) if len(values) else np.nan


def robust(errors: Iterable[float]) -> float:
    """Standard deviation from the median absolute value."""
    return _MEDIAN_TO_SD * median(errors)


def trimmed(errors: Iterable[float]) -> float:
    """Standard deviation from the RMS of the smallest 95 %."""
    values = np.sort(np.abs(list(errors)))
    kept = values[: int(np.ceil(_TRIMMED_SHARE * len(values)))]
    return float(np.sqrt(np.mean(kept**2)) / _TRIMMED_RMS) if len(kept) else np.nan


def covered(scores: Sequence[float]) -> float:
    """Share within the 95 % interval; NaN of nothing."""
    return float(np.mean(np.abs(scores) <= NORMAL_95)) if len(scores) else np.nan
