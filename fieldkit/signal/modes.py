"""Natural frequencies and damping from the free decays after taps."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True)
class TapRecord:
    """One usable tap cut out of a recording, ready for estimation."""

    samples: NDArray[np.float64]
    """(n,) free decay, from its start to its end."""
    rate_hz: float
    background: NDArray[np.float64]
    """(m,) samples of the same channel without any blow; may be empty."""
    source: str = ""


@dataclass(frozen=True)
class MeasuredMode:
    """A natural frequency found in measured data, or typed in by hand."""

    frequency_hz: float
    frequency_sd_hz: float
    damping_ratio: float | None
    damping_sd: float | None
    direction: str | None = None
    """``vertical``, ``lateral``, ``axial``, ``x``, ``y``, ``z``; None where nobody said."""
    taps: int = 0
    """How many taps it was seen in; 0 for a typed one."""
    strength: float = 1.0
    """Share of the strongest mode's decay energy, 0 to 1."""
    state: str = "tapped"
    at_m: float | None = None
    """Station of the sensor."""


@dataclass(frozen=True)
class Tone:
    """A steady line: there before the blow, or not decaying."""

    frequency_hz: float
    strength: float
    """Amplitude as a share of the strongest mode's (of the strongest tone's where there is none)."""


@dataclass(frozen=True)
class RefusedMode:
    """A peak that was looked at and not accepted as a mode."""

    frequency_hz: float
    reason: str


@dataclass(frozen=True)
class ModeEstimate:
    """What the taps of one direction say."""

    modes: tuple[MeasuredMode, ...]
    tones: tuple[Tone, ...]
    refused: tuple[RefusedMode, ...] = ()
    warnings: tuple[str, ...] = ()
