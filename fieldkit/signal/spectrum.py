"""Spectra with amplitude-true scaling."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True)
class Spectrum:
    """Amplitude against frequency, for looking at and for reading lines from."""

    frequency_hz: NDArray[np.float64]
    """(m,) evenly spaced from 0."""
    amplitude: NDArray[np.float64]
    """(m,) see ``scaling``."""
    scaling: str
    """``rms`` (a steady sine reads its RMS) or ``decay`` (mean magnitude of a tap's transform)."""
    quantity: str | None
    unit: str
    """SI unit of the quantity, or ``sample units`` where uncalibrated."""
    bandwidth_hz: float
    """Equivalent noise bandwidth of one line."""
