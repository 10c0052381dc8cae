"""What a recheck has to say."""

from __future__ import annotations

from dataclasses import dataclass

from fieldkit.detune.excitation import Band
from fieldkit.detune.fixes import Change
from fieldkit.detune.verdict import Detuning, Verdict
from fieldkit.signal.modes import MeasuredMode
from fieldkit.span.layout import Span

WORKED, FAILED, UNSURE = "it worked", "it did not work", "cannot say yet"


@dataclass(frozen=True)
class PromisedMode:
    """A mode with the change as drawn, in the state of the re-tap, beside what was measured."""

    direction: str
    low_hz: float
    """5 %, the scatter of installation in it."""
    median_hz: float
    high_hz: float
    """95 %."""
    measured: MeasuredMode | None
    """None where no peak was taken for it."""

    @property
    def measured_low_hz(self) -> float:
        """5 % of what was measured; 0 where nothing was."""
        m = self.measured
        return m.frequency_hz - 1.645 * m.frequency_sd_hz if m else 0.0

    @property
    def measured_high_hz(self) -> float:
        """95 %."""
        m = self.measured
        return m.frequency_hz + 1.645 * m.frequency_sd_hz if m else 0.0

    @property
    def inside(self) -> bool | None:
        """Whether the two intervals meet; None where nothing was measured."""
        if self.measured is None:
            return None
        return self.low_hz <= self.measured_high_hz and self.measured_low_hz <= self.high_hz


@dataclass(frozen=True)
class RunningMode:
    """A mode as the pipe runs now, by the re-tap where it was seen, else by the model."""

    direction: str
    low_hz: float
    median_hz: float
    high_hz: float
    measured_hz: float | None
    """In the state of the re-tap; None where only the model says so."""
    margin: float
    """Kept to every excitation, relative."""
    chance_clear: float
    band: str
    """The nearest excitation."""
    separation: float
    """Relative distance to it at the median."""


@dataclass(frozen=True)
class AsFound:
    """Something the change brought, as drawn and as found."""

    name: str
    unit: str
    drawn: float
    low: float
    """5 %."""
    median: float
    high: float
    """95 %."""
    informed: bool
    """Whether the re-tap narrowed it."""
    at_m: float | None = None
    """Station, where the name alone does not tell what is meant."""


@dataclass(frozen=True)
class Reason:
    """Why the pipe may ring elsewhere than promised."""

    name: str
    probability: float
    says: str
    check: str


@dataclass(frozen=True)
class Recheck:
    """Predicted against measured, whether it worked, why not, and what next."""

    change: Change
    summary: str
    state: str
    """Of the re-tap, in words."""
    same_state: bool
    """Whether the pipe runs in the state it was tapped in."""
    promised: tuple[PromisedMode, ...]
    unexplained: tuple[MeasuredMode, ...]
    """Peaks that belong to no mode of the span as it is found."""
    running: tuple[RunningMode, ...]
    bands_measured: tuple[Band, ...]
    """With the margin of a measured frequency."""
    margin: float
    margin_measured: float
    chance_before: float
    """Of success, as it was promised."""
    chance_now: float
    verdict: str
    because: str
    measure_next: str
    """Empty where nothing is to be measured."""
    ways: tuple[tuple[str, float], ...]
    """Each way the change may stand with its probability, most likely first."""
    found: tuple[AsFound, ...]
    reasons: tuple[Reason, ...]
    """Most likely first; empty where all is as promised."""
    effective_members: float
    span_now: Span
    """The span as it is found, each stiffness of the change with its doubt."""
    mended: Verdict | None
    """The support brought to what was drawn, where it was found softer."""
    next_fixes: Detuning | None
    """The ranked changes on the span as found; None where none is needed, or nothing was changed
    yet."""
    warnings: tuple[str, ...] = ()
