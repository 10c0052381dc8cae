"""What was measured on a pipe, ready to be matched with a model."""

from __future__ import annotations

from dataclasses import dataclass

from fieldkit.signal.modes import MeasuredMode, RefusedMode, Tone


@dataclass(frozen=True)
class Evidence:
    """The measured modes and tones of a job, from all recordings and typed entries."""

    modes: tuple[MeasuredMode, ...] = ()
    """In rising frequency."""
    tones: tuple[Tone, ...] = ()
    refused: tuple[RefusedMode, ...] = ()
    warnings: tuple[str, ...] = ()
