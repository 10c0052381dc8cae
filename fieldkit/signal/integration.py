"""From acceleration to velocity to displacement and back."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import InputError
from fieldkit.signal.welch import line_frequencies

CORNER_HZ = 2.0
"""Below it, integrated noise of a common accelerometer is larger than the motion (common
practice, no source)."""

_INTEGRALS = {"acceleration": 0, "velocity": 1, "displacement": 2}


def integrals_between(quantity: str | None, wanted: str) -> int:
    """How often to integrate over time from one quantity to another; negative: differentiate.

    Raises InputError where they are not both quantities of motion.
    """
    if quantity not in _INTEGRALS or wanted not in _INTEGRALS:
        known = quantity or "an unknown quantity"
        raise InputError(
            f"{known} cannot be turned into {wanted}",
            f"say what the channel measures: {', '.join(_INTEGRALS)}",
        )
    return _INTEGRALS[wanted] - _INTEGRALS[quantity]


def integrate(
    signal: NDArray[np.float64], rate_hz: float, times: int = 1, corner_hz: float = CORNER_HZ
) -> NDArray[np.float64]:
    """The signal (n,) integrated over time, without what lies below the corner.

    Dividing the transform by (i 2 pi f) takes the record as one period of a repeating signal:
    where its ends do not fit together, the first and last periods of the corner are distorted.
    """
    return _over_frequency(signal, rate_hz, times, corner_hz)


def differentiate(
    signal: NDArray[np.float64], rate_hz: float, times: int = 1
) -> NDArray[np.float64]:
    """The signal (n,) differentiated over time; see ``integrate``."""
    return _over_frequency(signal, rate_hz, -times, 0.0)


def frequency_factor(
    frequency_hz: NDArray[np.float64], integrals: int, corner_hz: float
) -> NDArray[np.float64]:
    """(2 pi f)^-integrals, and zero below the corner and at zero frequency where it integrates."""
    factor = np.zeros_like(frequency_hz)
    kept = (frequency_hz >= corner_hz) & (frequency_hz > 0) if integrals > 0 else slice(None)
    factor[kept] = (2 * np.pi * frequency_hz[kept]) ** -integrals
    return factor


def _over_frequency(
    signal: NDArray[np.float64], rate_hz: float, integrals: int, corner_hz: float
) -> NDArray[np.float64]:
    frequency_hz = line_frequencies(len(signal), rate_hz)
    factor = frequency_factor(frequency_hz, integrals, corner_hz)
    # irfft keeps the real part of the line at half the rate: its odd derivatives are 0 at samples.
    turned = np.fft.rfft(signal) * factor * (-1j) ** integrals
    return np.fft.irfft(turned, len(signal))
