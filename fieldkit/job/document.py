"""A job as the rest of the program sees it: plain values, SI units."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

from fieldkit.detune.excitation import Excitation, Goal
from fieldkit.signal.modes import MeasuredMode
from fieldkit.span.layout import Span, State


@dataclass(frozen=True)
class HammerEntry:
    """The channel of a tap recording that holds the force of the hammer."""

    channel: int
    """Counts from 1, as printed on the box."""
    scale: float | None = None
    """Newtons per unit of sample; None where uncalibrated."""
    at_m: float | None = None
    """Station that is struck; None where nobody said."""


@dataclass(frozen=True)
class RecordingEntry:
    """A recording named in the job file, and what it measures."""

    path: Path
    """Resolved against the job file."""
    kind: str
    """``tap`` or ``running``."""
    state: str
    """``tapped`` or ``running``."""
    channel: int = 1
    """Counts from 1, as printed on the box."""
    quantity: str = "acceleration"
    scale: float | None = None
    """SI units of the quantity per unit of sample; None where uncalibrated."""
    direction: str | None = None
    at_m: float | None = None
    rate_hz: float | None = None
    """For text files without a time column."""
    hammer: HammerEntry | None = None
    """None where no force was recorded."""


@dataclass(frozen=True)
class Job:
    """Everything a job file says."""

    title: str
    units: str
    """``SI`` or ``US``: what screens and sheets show."""
    span: Span
    tapped: State
    running: State
    excitations: tuple[Excitation, ...]
    recordings: tuple[RecordingEntry, ...] = ()
    measured: tuple[MeasuredMode, ...] = ()
    goal: Goal = field(default_factory=Goal)
    contents_name: str = ""
    path: Path | None = None

    def recordings_of(self, kind: str) -> tuple[RecordingEntry, ...]:
        """Its tap or its running recordings."""
        return tuple(entry for entry in self.recordings if entry.kind == kind)


def unnamed_excitation(index: int) -> str:
    """What an excitation is called that the file gives no name; ``index`` counts from 0."""
    return f"excitation {index + 1}"
