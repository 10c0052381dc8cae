"""What a running recording holds: steady lines and overall level."""

from __future__ import annotations

from dataclasses import dataclass

from fieldkit.signal.spectrum import Spectrum


@dataclass(frozen=True)
class RunningLine:
    """A line that stands clear of the spectrum around it."""

    frequency_hz: float
    rms: float
    prominence: float
    """Height over the median of the spectrum around it, as a ratio."""


@dataclass(frozen=True)
class RunningPicture:
    """One channel of a running recording, read."""

    spectrum: Spectrum
    lines: tuple[RunningLine, ...]
    """Strongest first."""
    overall_rms: float
    """RMS between low_hz and high_hz, in the spectrum's unit."""
    low_hz: float
    high_hz: float
    warnings: tuple[str, ...] = ()
