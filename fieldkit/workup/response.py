"""The measured frequency responses of a job with its modes fitted to them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from fieldkit.detune.evidence import Evidence
from fieldkit.errors import Refusal
from fieldkit.signal.hammer import ForceSpectrum
from fieldkit.signal.modal_response import FittedResponse, fit_response
from fieldkit.signal.modes import MeasuredMode
from fieldkit.signal.response import DERIVATIVES, FrequencyResponse
from fieldkit.workup.readings import TapReading

SAME_PLACE_M = 0.05
"""Hammer and sensor no farther apart stand at one point (common practice, no source)."""
LEAST_HZ = 2.0
_SEEN_SDS = 2.0


@dataclass(frozen=True)
class EffectiveMass:
    """Modal mass of one mode as it is felt at the struck point."""

    kg: float
    sd_kg: float
    """From the scatter of the response and the doubt of frequency and damping; that of the
    calibration is left out."""


@dataclass(frozen=True)
class ResponseReading:
    """The frequency response of one recording with a hammer."""

    file: str
    point: str
    """``driving`` (hammer at the sensor), ``transfer``, or ``unknown`` where a place is missing."""
    response: FrequencyResponse | None = None
    force: ForceSpectrum | None = None
    fitted: FittedResponse | None = None
    """None where there is no response, or no mode to fit to it."""
    masses: tuple[EffectiveMass | None, ...] = ()
    """One for each mode of ``fitted``; None where it cannot be told."""
    wired_round: bool = False
    """Whether sensor and hammer read against each other where they must agree."""
    refused: str = ""
    """Why there is no response."""
    not_fitted: str = ""
    """Why no mode is fitted to it."""
    notes: tuple[str, ...] = ()
    """On the blows."""

    @property
    def usable_to_hz(self) -> float | None:
        """Up to where the force excites; None where that lies beyond the recording."""
        return self.force.usable_to_hz if self.force else None


def response_reading(
    reading: TapReading, evidence: Evidence, up_to_hz: float
) -> ResponseReading | None:
    """The response with the modes found in the taps of its direction, its sensor and its state.

    None for a recording without a hammer.
    """
    hammer = reading.hammer
    if hammer is None:
        return None
    found = ResponseReading(
        reading.file,
        point_of(reading),
        hammer.response,
        hammer.force,
        refused=hammer.refused,
        notes=hammer.notes,
    )
    if hammer.response is None:
        return found
    return fitted_to(found, hammer.response, modes_of(reading, evidence), up_to_hz)


def point_of(reading: TapReading) -> str:
    """Where the hammer struck, against where the sensor sits."""
    hammer, sensor_m = reading.entry.hammer, reading.entry.at_m
    if hammer is None or hammer.at_m is None or sensor_m is None:
        return "unknown"
    return "driving" if abs(hammer.at_m - sensor_m) <= SAME_PLACE_M else "transfer"


def modes_of(reading: TapReading, evidence: Evidence) -> list[MeasuredMode]:
    """The modes that the taps of this direction, sensor and state gave."""
    entry = reading.entry
    here = "tap", entry.state, entry.direction, entry.at_m
    return [m for m in evidence.modes if (m.source, m.state, m.direction, m.at_m) == here]


def fitted_to(
    found: ResponseReading,
    response: FrequencyResponse,
    poles: Sequence[MeasuredMode],
    up_to_hz: float,
) -> ResponseReading:
    """With the modes that lie where the force excites."""
    high_hz = min(found.usable_to_hz or up_to_hz, float(response.frequency_hz[-1]))
    try:
        fitted = fit_response(response, poles, low_hz=LEAST_HZ, high_hz=high_hz)
    except Refusal as refusal:
        return replace(found, not_fitted=str(refusal))
    known = response.calibrated and response.quantity in DERIVATIVES
    driven = found.point == "driving"
    total = sum(mode.modal_constant for mode in fitted.modes)
    sign = -1.0 if driven and total < 0 else 1.0
    masses = tuple(
        effective_mass(sign * mode.modal_constant, mode.modal_constant_sd)
        if driven and known
        else None
        for mode in fitted.modes
    )
    return replace(found, fitted=fitted, masses=masses, wired_round=sign < 0)


def effective_mass(constant: float, sd: float) -> EffectiveMass | None:
    """One over the modal constant at the driven point; None where that is not surely above zero."""
    if constant <= _SEEN_SDS * sd:
        return None
    return EffectiveMass(1 / constant, sd / constant**2)
