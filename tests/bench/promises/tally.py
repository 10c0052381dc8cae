"""What many spans add up to."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from tests.bench.promises.trial import Trial

WANTED = 0.9
FIFTHS = tuple((i / 5, (i + 1) / 5) for i in range(5))


@dataclass(frozen=True)
class Tally:
    """Trials counted together; shares of nothing are NaN."""

    trials: Sequence[Trial]

    @property
    def refused(self) -> int:
        """Spans that were not answered at all."""
        return sum(bool(trial.refused) for trial in self.trials)

    @property
    def answered(self) -> list[Trial]:
        """The others."""
        return [trial for trial in self.trials if not trial.refused]

    @property
    def first(self) -> list[tuple[float, bool]]:
        """(promised, kept) of every first change."""
        return [
            (trial.promised, bool(trial.kept))
            for trial in self.trials
            if trial.promised is not None
        ]

    @property
    def offered(self) -> list[bool]:
        """Whether each change promised with the wanted chance was kept."""
        return [kept for promised, kept in self.first if promised >= WANTED]

    @property
    def offered_share(self) -> float:
        """Of all spans, refused ones included."""
        return len(self.offered) / len(self.trials) if self.trials else np.nan

    @property
    def kept_of_offered(self) -> float:
        """Share."""
        return mean(self.offered)

    @property
    def mean_promise(self) -> float:
        """Of all first changes, whatever their chance."""
        return mean([promised for promised, _ in self.first])

    @property
    def mean_kept(self) -> float:
        """Share of all first changes."""
        return mean([kept for _, kept in self.first])

    @property
    def coverage(self) -> float:
        """Share of 90 % intervals after the change that hold the truth."""
        return mean([held for trial in self.trials for held in trial.covered])

    @property
    def coverage_now(self) -> float:
        """The same before any change."""
        return mean([held for trial in self.trials for held in trial.covered_now])

    @property
    def median_error(self) -> float:
        """Absolute, of the first frequencies after the change."""
        errors = [abs(error) for trial in self.trials for error in trial.error]
        return float(np.median(errors)) if errors else np.nan

    def usual(self, name: str) -> list[bool]:
        """Whether what one of the usual ways chose holds."""
        return [kept for trial in self.trials for way, kept in trial.usual_kept if way == name]

    def between(self, low: float, high: float) -> tuple[list[float], list[bool]]:
        """Promised and kept where the promise lies in a stretch of the scale."""
        inside = [(p, k) for p, k in self.first if low <= p < high]
        return [p for p, _ in inside], [k for _, k in inside]


def mean(values: Sequence[float]) -> float:
    return float(np.mean(values)) if len(values) else np.nan
