"""What a running recording holds: steady lines and overall level."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import InputError, Refusal
from fieldkit.signal.health import clipping, offset_and_drift, unsteady_level
from fieldkit.signal.integration import CORNER_HZ, frequency_factor
from fieldkit.signal.spectrum import (
    SAMPLE_UNITS,
    Spectrum,
    overall_rms,
    power_density,
    running_spectrum,
)
from fieldkit.signal.steady_lines import RunningLine, find_lines
from fieldkit.signal.welch import LOWEST_LINE
from fieldkit.signal.windows import HANN

__all__ = ["RunningLine", "RunningPicture", "read_running"]

_INTEGRALS_TO_VELOCITY = {"acceleration": 1, "velocity": 0, "displacement": -1}
HIGHEST_SHARE_OF_RATE = 1 / 2.56
"""Where the filters of recorders begin to cut (common practice, no source)."""


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
    velocity_rms_m_per_s: float | None = None
    """The same level as velocity; None where the channel is uncalibrated or measures no motion."""


def read_running(
    signal: NDArray[np.float64],
    rate_hz: float,
    *,
    quantity: str | None = None,
    scale: float | None = None,
    low_hz: float = CORNER_HZ,
    high_hz: float | None = None,
    full_scale: float | None = None,
) -> RunningPicture:
    """Spectrum, steady lines and overall RMS of one channel (n,) of a running machine.

    A constant offset and a straight drift are removed first. ``high_hz`` left out is the rate
    over 2.56; ``full_scale`` is where the recording clips, in sample units. Raises InputError for
    an impossible band or samples that are not finite, Refusal for a silent or too short record.
    """
    high_hz, warnings = upper_limit(rate_hz, low_hz, high_hz)
    _check_signal(signal)
    vibration, drift_warnings = offset_and_drift(signal)
    spectrum = running_spectrum(vibration, rate_hz, quantity=quantity, scale=scale, low_hz=low_hz)
    factor = 1.0 if scale is None or spectrum.unit == SAMPLE_UNITS else scale
    band = {"low_hz": low_hz, "high_hz": high_hz}
    return RunningPicture(
        spectrum=spectrum,
        lines=find_lines(vibration, rate_hz, spectrum, scale=factor, **band),
        overall_rms=factor * overall_rms(vibration, rate_hz, **band),
        **band,
        warnings=(
            *warnings,
            *clipping(signal, full_scale),
            *drift_warnings,
            *unsteady_level(vibration),
            *short_record(len(signal) / rate_hz, low_hz),
        ),
        velocity_rms_m_per_s=_velocity_rms(vibration, rate_hz, quantity, scale, **band),
    )


def _velocity_rms(
    vibration: NDArray[np.float64],
    rate_hz: float,
    quantity: str | None,
    scale: float | None,
    low_hz: float,
    high_hz: float,
) -> float | None:
    if scale is None or quantity not in _INTEGRALS_TO_VELOCITY:
        return None
    density = power_density(vibration, rate_hz, scale=scale, low_hz=low_hz)
    return velocity_rms(*density, quantity, low_hz=low_hz, high_hz=high_hz)


def velocity_rms(
    frequency_hz: NDArray[np.float64],
    density: NDArray[np.float64],
    quantity: str,
    *,
    low_hz: float,
    high_hz: float,
) -> float | None:
    """Velocity between two frequencies, from a power density in SI divided by (2 pi f)^2 as needed.

    None where the quantity is not one of motion.
    """
    if quantity not in _INTEGRALS_TO_VELOCITY:
        return None
    kept = (frequency_hz >= low_hz) & (frequency_hz <= high_hz)
    factor = frequency_factor(frequency_hz[kept], _INTEGRALS_TO_VELOCITY[quantity], low_hz)
    step_hz = frequency_hz[1] - frequency_hz[0]
    return float(np.sqrt(np.sum(density[kept] * factor**2) * step_hz))


def upper_limit(
    rate_hz: float, low_hz: float, high_hz: float | None
) -> tuple[float, tuple[str, ...]]:
    """The upper end of the band, and what is said where less can be had than was wanted."""
    limit_hz = rate_hz / 2
    wanted_hz = HIGHEST_SHARE_OF_RATE * rate_hz if high_hz is None else high_hz
    if not 0 < low_hz < min(wanted_hz, limit_hz):
        raise InputError(
            f"a band from {low_hz:g} to {wanted_hz:g} Hz in a recording at {rate_hz:g} Hz",
            f"give a lower frequency above zero and a higher one up to {limit_hz:g} Hz",
        )
    if wanted_hz <= limit_hz:
        return wanted_hz, ()
    said = f"a recording at {rate_hz:g} Hz holds nothing above {limit_hz:g} Hz"
    return limit_hz, (f"{said}; the band was cut there",)


def _check_signal(signal: NDArray[np.float64]) -> None:
    if not np.isfinite(signal).all():
        raise InputError("the recording holds samples that are not finite", "export it again")
    if len(signal) == 0 or np.ptp(signal) == 0.0:
        raise silent()


def silent() -> Refusal:
    """What is said of a channel without any signal."""
    return Refusal(
        "the channel is silent", "check cable, sensor supply and input level, then record again"
    )


def short_record(duration_s: float, low_hz: float) -> tuple[str, ...]:
    """What is said of a record that is short for its lowest frequency."""
    needed_s = LOWEST_LINE / low_hz
    if duration_s >= needed_s:
        return ()
    apart_hz, lowest_hz = HANN.half_width_bins / duration_s, LOWEST_LINE / duration_s
    return (
        f"the recording lasts only {duration_s:.2g} s: lines closer than {apart_hz:.2g} Hz cannot "
        f"be told apart and levels below {lowest_hz:.2g} Hz are not reliable; record at least 30 s",
    )
