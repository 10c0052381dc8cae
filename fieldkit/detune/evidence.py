"""What was measured on a pipe, ready to be matched with a model."""

from __future__ import annotations

from dataclasses import dataclass

from fieldkit.signal.modes import MeasuredMode, RefusedMode, Tone

RUNNING = "running"
"""Source of a mode that was found without a tap."""


@dataclass(frozen=True)
class Evidence:
    """The measured modes and tones of a job, from all recordings and typed entries."""

    modes: tuple[MeasuredMode, ...] = ()
    """In rising frequency."""
    tones: tuple[Tone, ...] = ()
    refused: tuple[RefusedMode, ...] = ()
    warnings: tuple[str, ...] = ()

    @property
    def firm(self) -> tuple[MeasuredMode, ...]:
        """Modes from taps or typed in."""
        return tuple(mode for mode in self.modes if mode.source != RUNNING)

    @property
    def running(self) -> tuple[MeasuredMode, ...]:
        """Modes seen while running, with unknown forces: weaker."""
        return tuple(mode for mode in self.modes if mode.source == RUNNING)
