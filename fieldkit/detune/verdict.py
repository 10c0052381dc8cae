"""A fix judged over the ensemble in the running state."""

from __future__ import annotations

from dataclasses import dataclass

from fieldkit.detune.excitation import Band
from fieldkit.detune.fixes import Change


@dataclass(frozen=True)
class JudgedMode:
    """A mode in the running state over the ensemble."""

    median_hz: float
    low_hz: float
    """5 %."""
    high_hz: float
    """95 %."""
    direction: str
    chance_clear: float
    """Share of the ensemble in which this mode lies outside every band."""


@dataclass(frozen=True)
class Nearest:
    """The band that is closest to any mode, at the ensemble medians."""

    band: str
    separation: float
    """Relative distance to the excitation itself, not to its widened band."""


@dataclass(frozen=True)
class Verdict:
    """One fix, judged."""

    rank: int
    kind: str
    summary: str
    """One sentence in the job's display units."""
    change: Change
    modes_after: tuple[JudgedMode, ...]
    nearest: Nearest
    chance: float
    """Chance that every mode up to the goal's limit lies outside every band."""
    cautions: tuple[str, ...]
    why: str = ""
    """Why it works, one sentence."""
    fails: str = ""
    """What would make it fail."""


@dataclass(frozen=True)
class OtherCure:
    """A cure whose promise is not that every mode is clear: it lives with the resonance."""

    kind: str
    """``absorber`` or ``damping``."""
    summary: str
    chance: float | None
    """None where nothing is promised."""
    chance_means: str
    """What the chance is the chance of."""
    change: Change | None = None
    direction: str = ""
    amplification_now: float | None = None
    amplification_after: float | None = None
    """Median over the members, of the mode in question; displacement over that at rest."""
    cautions: tuple[str, ...] = ()


@dataclass(frozen=True)
class Detuning:
    """The question and the ranked answers, in the running state."""

    state: str
    margin: float
    bands: tuple[Band, ...]
    modes: tuple[JudgedMode, ...]
    """As it is now."""
    chance_now: float
    nearest_now: Nearest | None
    fixes: tuple[Verdict, ...]
    warnings: tuple[str, ...] = ()
    tried: int = 0
    """How many changes were counted."""
    other_cures: tuple[OtherCure, ...] = ()
