"""What a capture session is doing, frozen for whoever shows it."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from fieldkit.capture.meter import ChannelLevel

OPENING = "opening"
RUNNING = "running"
PAUSED = "paused"
WAITING = "waiting"
ENDED = "ended"


@dataclass(frozen=True, slots=True)
class RecordingState:
    """A recording of the session, in progress or done."""

    paths: tuple[Path, ...]
    """Its parts, in order; nearly always one."""
    seconds: float
    """Written so far."""
    gaps: int
    first_frame: int
    """Number, in the session's count, of its first frame."""
    done: bool
    failure: str = ""
    """Why it ended early, as a sentence."""


@dataclass(frozen=True, slots=True)
class Snapshot:
    """The session at one moment."""

    state: str
    """OPENING, RUNNING, PAUSED, WAITING (the input is away) or ENDED."""
    source: str
    simulated: bool
    rate_hz: int
    frames: int
    """Frames heard so far, those lost or paused not counted."""
    lost_frames: int
    """As far as their number is known."""
    gaps: int
    levels: tuple[ChannelLevel, ...]
    message: str
    """The latest thing to tell the user, one sentence; empty where all is well."""
    recording: RecordingState | None = None
    failed: bool = False
    """Whether it ended because the input could not be opened, or did not come back."""

    @property
    def seconds(self) -> float:
        """Heard so far."""
        return self.frames / self.rate_hz
