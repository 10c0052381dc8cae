"""What a match has to say: pairs, what was learnt of each unknown, the ensemble."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.modes import MeasuredMode


@dataclass(frozen=True)
class ParameterReading:
    """One unknown after the match, beside what was believed before."""

    name: str
    unit: str
    prior_median: float
    prior_low: float
    prior_high: float
    median: float
    low: float
    """5 %."""
    high: float
    """95 %."""
    informed: bool
    """Whether the tap narrowed it."""


@dataclass(frozen=True)
class Pair:
    """A measured mode beside the computed one it is taken for."""

    mode: int
    """Number of the computed mode, from 1."""
    measured: MeasuredMode
    prior_hz: float
    """Computed before the match, every unknown at its prior median."""
    model_hz: float
    """Ensemble median."""
    low_hz: float
    high_hz: float
    direction: str
    handbook_hz: float | None
    """Handbook estimate, where it speaks of this mode (the first)."""


@dataclass(frozen=True)
class Ensemble:
    """Weighted parameter sets that agree with the evidence."""

    names: tuple[str, ...]
    standard: NDArray[np.float64]
    """(members, parameters) in standard-normal coordinates of the prior."""
    weights: NDArray[np.float64]
    """(members,) summing to 1."""
    fresh: NDArray[np.float64] | None = None
    """(members, parameters) as many again, from other first draws: what was chosen for doing well
    on ``standard`` is judged on these, or the choice itself would flatter it."""
    independent: float | None = None
    """How many independent draws all of them are worth, where the sampler told."""

    @property
    def judging(self) -> NDArray[np.float64]:
        """(members, parameters) that what was chosen is judged on."""
        return self.standard if self.fresh is None else self.fresh

    @property
    def effective_size(self) -> float:
        """Number of independent, equally weighted members that would say as much."""
        if self.independent is not None:
            return self.independent
        return float(1 / np.sum(self.weights**2))


@dataclass(frozen=True)
class ModelMode:
    """One mode of the ensemble in one state."""

    median_hz: float
    low_hz: float
    """5 %."""
    high_hz: float
    """95 %."""
    direction: str
    where_m: float
    """Station where it moves most."""


@dataclass(frozen=True)
class Match:
    """Everything the match has to say."""

    measured: tuple[MeasuredMode, ...]
    pairs: tuple[Pair, ...]
    unpaired: tuple[MeasuredMode, ...]
    parameters: tuple[ParameterReading, ...]
    ensemble: Ensemble
    tapped_modes: tuple[ModelMode, ...]
    next_measurement: str
    warnings: tuple[str, ...] = ()
