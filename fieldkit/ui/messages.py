"""What widgets, views and workers tell the app. Attributes go down, messages come up."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray
from textual.message import Message

if TYPE_CHECKING:
    from fieldkit.detune.verdict import Verdict
    from fieldkit.job.document import Job, RecordingEntry
    from fieldkit.job.store import JobText
    from fieldkit.span.modes import Mode
    from fieldkit.workup import StateModes, Workup


@dataclass
class JobOpened(Message):
    """A job was read and holds together."""

    text: JobText
    job: Job


@dataclass
class OpenFailed(Message):
    """A job could not be read; ``sentence`` says why and what to do."""

    path: Path
    sentence: str


@dataclass
class WorkStep(Message):
    """How far the work has come; a newer one makes a waiting older one pointless."""

    ticket: int
    doing: str
    fraction: float

    def can_replace(self, message: Message) -> bool:
        """Only the newest step matters."""
        return isinstance(message, WorkStep)


@dataclass
class SpanReady(Message):
    """Computed modes of every state, unknowns at their prior medians."""

    ticket: int
    states: tuple[StateModes, ...]
    refused: str = ""
    """Why there are none, in words for the user."""


@dataclass
class PartReady(Message):
    """One more step of the chain is done; the later ones are still missing."""

    ticket: int
    workup: Workup


@dataclass
class WorkupReady(Message):
    """The whole chain is done."""

    ticket: int
    workup: Workup


@dataclass
class WorkFailed(Message):
    """The chain could not be finished; ``sentence`` says why and what to do."""

    ticket: int
    sentence: str


@dataclass
class WorkStopped(Message):
    """The user's wish to stop has been carried out."""

    ticket: int


@dataclass
class FixChosen(Message):
    """The user put the cursor on a fix."""

    verdict: Verdict

    def can_replace(self, message: Message) -> bool:
        """Only the last fix looked at matters."""
        return isinstance(message, FixChosen)


@dataclass
class FixShaped(Message):
    """Mode shapes of the span with a fix applied."""

    ticket: int
    verdict: Verdict
    modes: tuple[Mode, ...]


@dataclass
class TraceWanted(Message):
    """A plot needs the samples of a recording."""

    entry: RecordingEntry


@dataclass
class TraceReady(Message):
    """What a recording entry names (n,), evenly over its time; empty where unreadable."""

    entry: RecordingEntry
    samples: NDArray[np.float64]


@dataclass
class AdoptWanted(Message):
    """The user wants a fix written into the job."""

    verdict: Verdict


@dataclass
class EditWanted(Message):
    """The user wants to change one row of the job."""

    table: str
    """Key of the table in the job file, such as ``support`` or ``state.running``."""
    index: int | None
    """Row of a repeated table, from 0; None for a single one."""


@dataclass
class AddWanted(Message):
    """The user wants a new row in the job."""

    table: str
    preset: dict[str, str] = field(default_factory=dict)
    """What its form starts with."""


@dataclass
class RemoveWanted(Message):
    """The user wants a row taken out of the job."""

    table: str
    index: int
