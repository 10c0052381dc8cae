"""What the plots are given, drawn from the desk."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import replace
from typing import TYPE_CHECKING

from fieldkit.detune.excitation import excitation_band
from fieldkit.ui.units import AMPLITUDES
from fieldkit.ui.widgets import BandShade, Curve, DecayLine, Mark, TapMark
from fieldkit.ui.widgets.spectrum_data import ROLES
from fieldkit.ui.words import DASH, plus_minus, safe

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from fieldkit.signal.modes import MeasuredMode
    from fieldkit.signal.running import RunningLine
    from fieldkit.signal.spectrum import Spectrum
    from fieldkit.ui.desk import Desk
    from fieldkit.workup import TapReading

SHORT = {"vertical": "vert", "lateral": "lat", "axial": "ax", "vertical+lateral": "v+l"}
"""Directions where there is little room."""
MOST_MARKS = 8
LETTERS = "ABCDEFGH"
RUNG_OUT = 4.0
"""Time constants after which 2 % of a decay are left."""
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


def overlaid(spectra: Iterable[tuple[Spectrum, str]]) -> tuple[Curve, ...]:
    """Several spectra over each other, told apart by letter and by the way the line is broken."""
    return tuple(
        replace(
            spectrum_curve(spectrum, label),
            role=ROLES[number % len(ROLES)],
            letter=LETTERS[number % len(LETTERS)],
        )
        for number, (spectrum, label) in enumerate(spectra)
    )


def decay_lines(
    reading: TapReading | None, samples: NDArray[np.float64] | None, modes: Iterable[MeasuredMode]
) -> tuple[DecayLine, ...]:
    """The envelope of the strongest mode of a recording over each of its usable blows."""
    from fieldkit.signal.decay_line import decay_height

    if reading is None or samples is None or not len(samples):
        return ()
    entry = reading.entry
    own = [m for m in modes if m.damping_ratio and m.direction in (entry.direction, None)]
    mode = max(own, key=lambda m: m.strength, default=None)
    if mode is None or mode.damping_ratio is None:
        return ()
    rate_hz = len(samples) / reading.duration_s
    decay = mode.damping_ratio * 2 * math.pi * mode.frequency_hz
    word = f"decay of {mode.frequency_hz:.1f} Hz, {100 * mode.damping_ratio:.2g} %"
    found = []
    for tap in reading.search.taps:
        start_s, end_s = tap.start / reading.rate_hz, tap.end / reading.rate_hz
        height = decay_height(
            samples[round(start_s * rate_hz) : round(end_s * rate_hz)], rate_hz, decay
        )
        if tap.usable and height is not None:
            rung_out_s = min(end_s, start_s + RUNG_OUT / decay)
            found.append(DecayLine(start_s, rung_out_s, height, decay, word))
    return tuple(found)


def mode_marks(modes: Iterable[MeasuredMode]) -> tuple[Mark, ...]:
    """Measured modes, with their direction where it is known, and their damping."""
    strongest_first = sorted(modes, key=lambda mode: -mode.strength)
    return tuple(Mark(mode.frequency_hz, _mode_label(mode)) for mode in strongest_first)


def _mode_label(mode: MeasuredMode) -> str:
    direction = SHORT.get(mode.direction or "", mode.direction or "")
    damping = f"{100 * mode.damping_ratio:.2g} %" if mode.damping_ratio else ""
    return " ".join(word for word in (direction, damping) if word)


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
