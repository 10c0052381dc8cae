"""A running recording screened, or why its level cannot be."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fieldkit.detune.diagnosis import Line
from fieldkit.detune.severity import Level, LineLevel, Screening, screenings
from fieldkit.job.document import Job
from fieldkit.signal.integration import frequency_factor, integrals_between
from fieldkit.signal.spectrum import SAMPLE_UNITS
from fieldkit.workup.readings import RunningReading

LINE_DOUBT_BINS = 0.1
"""A line of a windowed spectrum is placed to about this share of its spacing."""


@dataclass(frozen=True)
class Screened:
    """What a recording was screened against, or the reason why it was not."""

    screenings: tuple[Screening, ...] = ()
    refused: str = ""


def lines_of(reading: RunningReading) -> tuple[Line, ...]:
    """The lines of a recording as the diagnosis takes them."""
    spectrum = reading.picture.spectrum
    sd_hz = LINE_DOUBT_BINS * float(spectrum.frequency_hz[1])
    return tuple(
        Line(
            line.frequency_hz,
            sd_hz,
            line.rms,
            spectrum.unit,
            line.steady,
            reading.entry.direction,
            reading.file,
        )
        for line in reading.picture.lines
    )


def screened(reading: RunningReading, job: Job | None, first_mode_hz: float | None) -> Screened:
    """Every criterion this recording can be held against; none where the velocity is unknown."""
    level = _level(reading)
    if level is None:
        return Screened(refused=_why_unknown(reading))
    span, state = (job.span, job.running) if job else (None, None)
    return Screened(screenings(level, span, state, first_mode_hz))


def _level(reading: RunningReading) -> Level | None:
    picture = reading.picture
    if picture.velocity_rms_m_per_s is None:
        return None
    integrals = integrals_between(picture.spectrum.quantity, "velocity")
    hz = np.array([line.frequency_hz for line in picture.lines])
    rms = np.array([line.rms for line in picture.lines])
    velocity = rms * frequency_factor(hz, integrals, picture.low_hz)
    lines = tuple(LineLevel(float(f), float(v)) for f, v in zip(hz, velocity, strict=True))
    return Level(lines, picture.velocity_rms_m_per_s, picture.low_hz, picture.high_hz)


def _why_unknown(reading: RunningReading) -> str:
    spectrum = reading.picture.spectrum
    if spectrum.unit == SAMPLE_UNITS:
        return (
            f"{reading.file}: not screened for severity, since its level is not calibrated; state "
            "the sensitivity of the sensor (with full_scale of the recorder), or measure it on a "
            "reference shaker with fieldkit record --calibrate"
        )
    return (
        f"{reading.file}: not screened for severity, since {spectrum.quantity or 'this channel'} "
        "is no motion of the pipe; record acceleration or velocity with a calibrated sensor"
    )
