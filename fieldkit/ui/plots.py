"""What the plots are given, drawn from the desk."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING

from fieldkit.detune.excitation import excitation_band
from fieldkit.ui.units import AMPLITUDES
from fieldkit.ui.widgets import BandShade, Curve, Mark, TapMark
from fieldkit.ui.words import DASH, plus_minus, safe

if TYPE_CHECKING:
    from fieldkit.signal.modes import MeasuredMode
    from fieldkit.signal.running import RunningLine
    from fieldkit.signal.spectrum import Spectrum
    from fieldkit.ui.desk import Desk
    from fieldkit.workup import TapReading

SHORT = {"vertical": "vert", "lateral": "lat", "axial": "ax", "vertical+lateral": "v+l"}
"""Directions where there is little room."""
MOST_MARKS = 8
SAME = 0.02
"""A computed mode this near to one that was seen needs no mark of its own."""


def shaded(desk: Desk) -> tuple[BandShade, ...]:
    """The bands to keep clear of."""
    return tuple(
        BandShade(band.low_hz, band.high_hz, band.avoid_low_hz, band.avoid_high_hz, safe(band.name))
        for band in desk.bands
    )


def spectrum_curve(spectrum: Spectrum, label: str) -> Curve:
    """A spectrum in the unit that levels are read in."""
    factor, _ = AMPLITUDES.get(spectrum.unit, (1.0, spectrum.unit))
    return Curve(spectrum.frequency_hz, factor * spectrum.amplitude, label)


def unit_of(spectrum: Spectrum | None) -> str:
    """Unit of the amplitude axis."""
    return AMPLITUDES.get(spectrum.unit, (1.0, spectrum.unit))[1] if spectrum else ""


def blow_marks(reading: TapReading | None) -> tuple[TapMark, ...]:
    """The blows of a recording; the first word of a reason has to do."""
    if reading is None:
        return ()
    return tuple(
        TapMark(number, tap.at_s, tap.usable, _in_short(tap.reasons))
        for number, tap in enumerate(reading.search.taps, start=1)
    )


def _in_short(reasons: tuple[str, ...]) -> str:
    return safe(reasons[0].partition(":")[0]) if reasons else ""


def mode_marks(modes: Iterable[MeasuredMode]) -> tuple[Mark, ...]:
    """Measured modes, with their direction where it is known."""
    return tuple(
        Mark(mode.frequency_hz, SHORT.get(mode.direction or "", mode.direction or ""))
        for mode in modes
    )


def tap_marks(desk: Desk) -> tuple[Mark, ...]:
    """Modes, tones and refused peaks of the evidence."""
    if desk.workup is None:
        return ()
    evidence = desk.workup.evidence
    tones = tuple(Mark(tone.frequency_hz, "tone", "tone") for tone in evidence.tones)
    refused = tuple(Mark(peak.frequency_hz, "", "refused") for peak in evidence.refused)
    return (*mode_marks(evidence.firm), *tones, *refused)


def running_marks(
    lines: Iterable[RunningLine], seen: Iterable[MeasuredMode], desk: Desk
) -> tuple[Mark, ...]:
    """The strongest lines with their order, the modes seen, and the computed ones beside them."""
    strongest = sorted(lines, key=lambda line: -line.rms)[:MOST_MARKS]
    orders = [(line, excitation_band(line.frequency_hz, desk.bands)) for line in strongest]
    marks = tuple(Mark(line.frequency_hz, o.name if o else "", "tone") for line, o in orders)
    found = tuple(Mark(mode.frequency_hz, "seen", "mode") for mode in seen)
    others = [hz for hz in desk.mode_hz if all(abs(hz / m.frequency_hz - 1) > SAME for m in found)]
    return (*marks, *found, *(Mark(hz, "mode", "mode") for hz in others))


def mode_cells(mode: MeasuredMode) -> tuple[str, str]:
    """Frequency and damping of a measured mode with their doubt."""
    frequency = plus_minus(mode.frequency_hz, mode.frequency_sd_hz)
    if mode.damping_ratio is None:
        return frequency, DASH
    doubt = 100 * (mode.damping_sd or 0.0)
    return frequency, plus_minus(100 * mode.damping_ratio, doubt, most=2)
