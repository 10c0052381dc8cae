"""Spectra of taps and of the running machine, with modes, tones and bands; decays of modes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.excitation import Band
from fieldkit.sheet.content import Figure
from fieldkit.sheet.drawing import (
    BAND,
    BAND_CORE,
    FIRST,
    INK,
    MUTED,
    PAPER,
    SECOND,
    drawn,
    plain_logarithm,
    svg_of,
)
from fieldkit.sheet.plain import clean
from fieldkit.signal.modes import MeasuredMode, Tone
from fieldkit.signal.spectrum import SAMPLE_UNITS, Spectrum
from fieldkit.workup import RunningReading, TapReading

Array = NDArray[np.float64]

COLUMNS = 900
DECADES_SHOWN = 4.0
DECAY_DECADES = 2.5
HEIGHT_IN = 2.35
WIDTHS = (0.01, 0.06)
"""Least and most half width, relative to its frequency, of the filter that takes one mode out."""
NEIGHBOUR_SHARE = 0.3
"""Half width over the distance to the nearest other mode: what is left of that is under 1 %."""


@dataclass(frozen=True)
class Marks:
    """What is drawn over a spectrum."""

    modes: tuple[MeasuredMode, ...] = ()
    tones: tuple[Tone, ...] = ()
    bands: tuple[Band, ...] = ()


def tap_figure(reading: TapReading, marks: Marks, up_to_hz: float, number: int) -> Figure | None:
    """Spectrum of a tap recording beside the decay of its strongest mode; None without a tap."""
    if reading.spectrum is None:
        return None
    strongest = max(marks.modes, key=lambda mode: mode.strength, default=None)
    with drawn(HEIGHT_IN) as figure:
        left, right = figure.subplots(1, 2, gridspec_kw={"width_ratios": [1.75, 1]})
        figure.subplots_adjust(left=0.1, right=0.985, top=0.83, bottom=0.17, wspace=0.2)
        _spectrum(left, reading.spectrum, marks, up_to_hz)
        left.set_title(clean(reading.file), pad=14)
        _decay(right, reading, strongest, marks.modes)
        shown = caption(reading, strongest)
        return Figure(shown, svg_of(figure, f"tap {number}", shown))


def caption(reading: TapReading, strongest: MeasuredMode | None) -> str:
    """What is to be seen of a tap recording."""
    said = (
        f"{reading.file}: mean spectrum of {len(reading.records)} usable taps with measured modes "
        "(lines with their frequency), steady tones (dotted) and the bands to avoid (shaded, the "
        "excitation itself darker)"
    )
    if strongest is None or strongest.damping_ratio is None:
        return said
    return (
        f"{said}; beside it the decay of the mode at {strongest.frequency_hz:.2f} Hz in each tap, "
        f"and the straight line that a damping of {100 * strongest.damping_ratio:.3f} % draws, "
        "exp(-2 pi f zeta t)"
    )


def running_figure(
    reading: RunningReading, bands: Sequence[Band], up_to_hz: float, number: int
) -> Figure:
    """Spectrum of a running recording with its strongest lines and the excitations."""
    with drawn(HEIGHT_IN) as figure:
        axes = figure.subplots()
        figure.subplots_adjust(left=0.1, right=0.985, top=0.83, bottom=0.17)
        modes = reading.modes.modes if reading.modes else ()
        highest = min(up_to_hz, float(reading.picture.spectrum.frequency_hz[-1]))
        highest = max([highest, *(1.1 * b.high_hz for b in bands if b.high_hz < 2 * up_to_hz)])
        _spectrum(axes, reading.picture.spectrum, Marks(bands=tuple(bands)), highest)
        lines = [line for line in reading.picture.lines if line.frequency_hz < highest][:6]
        _name_peaks(axes, [(line.frequency_hz, MUTED) for line in lines])
        for mode in modes:
            axes.axvline(mode.frequency_hz, color=SECOND, linewidth=0.8, linestyle=(0, (4, 2)))
        where = f", {reading.entry.direction}" if reading.entry.direction else ""
        axes.set_title(f"{clean(reading.file)}, channel {reading.entry.channel}{where}", pad=14)
        shown = (
            f"{reading.file}, channel {reading.entry.channel}{where}: spectrum of the running "
            "machine, a steady line reads its RMS; excitations dark, what is to be kept clear "
            "around them shaded"
            + ("; dashed, natural frequencies seen while running" if modes else "")
        )
        return Figure(shown, svg_of(figure, f"running {number}", shown))


def _spectrum(axes: Any, spectrum: Spectrum, marks: Marks, up_to_hz: float) -> None:
    inside = (spectrum.frequency_hz > 1.0) & (spectrum.frequency_hz <= up_to_hz)
    hz, amplitude = spectrum.frequency_hz[inside], spectrum.amplitude[inside]
    if len(hz) and np.any(amplitude > 0):
        axes.plot(*_outline(hz, amplitude), color=INK, linewidth=0.8)
        top = float(amplitude.max())
        axes.set_yscale("log")
        axes.set_ylim(top * 10**-DECADES_SHOWN, top * 1.6)
        plain_logarithm(axes.yaxis)
    axes.set_xlim(0, up_to_hz)
    _bands(axes, marks.bands)
    for tone in marks.tones:
        axes.axvline(tone.frequency_hz, color=MUTED, linewidth=0.8, linestyle=":")
    for mode in marks.modes:
        axes.axvline(mode.frequency_hz, color=FIRST, linewidth=0.8)
    _name_peaks(axes, [(mode.frequency_hz, FIRST) for mode in marks.modes])
    axes.set_xlabel("frequency, Hz")
    unit = "relative" if spectrum.unit == SAMPLE_UNITS else spectrum.unit
    axes.set_ylabel(f"{unit} s" if spectrum.scaling == "decay" and unit != "relative" else unit)


def _bands(axes: Any, bands: Sequence[Band]) -> None:
    """What is to be kept clear, and the excitations themselves."""
    for band in bands:
        axes.axvspan(band.avoid_low_hz, band.avoid_high_hz, color=BAND, linewidth=0, zorder=0)
    for band in bands:
        axes.axvspan(
            band.low_hz, band.high_hz, color=BAND_CORE, linewidth=0.6, alpha=0.45, zorder=0.5
        )


def _name_peaks(axes: Any, peaks: Sequence[tuple[float, str]]) -> None:
    """The frequency over each line, none over another."""
    low, high = axes.get_xlim()
    clear, last = 0.07 * (high - low), -np.inf
    for hz, colour in sorted(peaks):
        if hz - last < clear or not low <= hz <= high:
            continue
        last = hz
        axes.annotate(
            f"{hz:.1f}", (hz, 1.0), (0, 3), xycoords=("data", "axes fraction"),
            textcoords="offset points", ha="center", va="bottom", fontsize=7, color=colour,
        )  # fmt: skip


def _outline(hz: Array, amplitude: Array) -> tuple[Array, Array]:
    """At most two points for each column of the drawing, its lowest and its highest."""
    if len(hz) <= 2 * COLUMNS:
        return hz, amplitude
    parts = np.array_split(np.arange(len(hz)), COLUMNS)
    kept = [sorted((int(p[amplitude[p].argmin()]), int(p[amplitude[p].argmax()]))) for p in parts]
    chosen = np.array(kept).ravel()
    return hz[chosen], amplitude[chosen]


def _decay(
    axes: Any, reading: TapReading, mode: MeasuredMode | None, others: Sequence[MeasuredMode]
) -> None:
    if mode is None or mode.damping_ratio is None or not mode.damping_ratio > 0:
        axes.set_axis_off()
        axes.text(0, 0.9, "no measured mode to follow", va="top", color=MUTED)
        return
    rate = 2 * np.pi * mode.frequency_hz * mode.damping_ratio
    end_s = DECAY_DECADES * np.log(10) / rate
    for record in reading.records:
        filtered = mode.frequency_hz, half_width_hz(mode, others)
        time_s, envelope = envelope_of(record.samples, record.rate_hz, *filtered, rate)
        shown = time_s <= end_s
        axes.plot(*_thinned(time_s[shown], envelope[shown]), color=MUTED, linewidth=0.7)
    at = np.array([0.0, end_s])
    axes.plot(at, np.exp(-rate * at), color=PAPER, linewidth=2.6)
    axes.plot(at, np.exp(-rate * at), color=FIRST, linewidth=1.3)
    axes.set_yscale("log")
    axes.set_ylim(10**-DECAY_DECADES, 2.0)
    plain_logarithm(axes.yaxis)
    axes.set_xlim(0, end_s)
    axes.set_xlabel("time after the blow, s")
    axes.set_title(f"decay at {mode.frequency_hz:.1f} Hz", pad=14)


def half_width_hz(mode: MeasuredMode, others: Sequence[MeasuredMode]) -> float:
    """Standard deviation of the filter that takes one mode and leaves its neighbours."""
    apart = [abs(other.frequency_hz - mode.frequency_hz) for other in others if other != mode]
    share = NEIGHBOUR_SHARE * min(apart, default=np.inf)
    least, most = (width * mode.frequency_hz for width in WIDTHS)
    return float(min(max(share, least), most))


def envelope_of(
    samples: Array, rate_hz: float, frequency_hz: float, half_width_hz: float, decay_rate: float
) -> tuple[Array, Array]:
    """Time in seconds and envelope of one mode in a free decay (n,), where the filter has filled.

    The analytic signal behind a Gaussian filter about the mode, in the frequency domain. Its level
    is such that exp(-decay_rate t) lies through the first half of what stands above a tenth.
    """
    length = 2 * len(samples)
    hz = np.fft.fftfreq(length, 1 / rate_hz)
    gain = 2 * np.exp(-0.5 * ((hz - frequency_hz) / half_width_hz) ** 2)
    transform = np.fft.fft(samples - samples.mean(), length)
    envelope = np.abs(np.fft.ifft(transform * gain * (hz > 0)))[: len(samples)]
    time_s = np.arange(len(samples)) / rate_hz
    begun = min(int(3 * rate_hz / (2 * np.pi * half_width_hz)), len(samples) // 2)
    above = envelope > 0.1 * envelope.max()
    last = max(int(np.flatnonzero(above)[-1]), begun + 8)
    part = slice(begun, begun + max((last - begun) // 2, 8))
    level = np.mean(np.log(np.maximum(envelope[part], 1e-300)) + decay_rate * time_s[part])
    return time_s[begun:], envelope[begun:] / np.exp(level)


def _thinned(time_s: Array, envelope: Array) -> tuple[Array, Array]:
    step = max(1, len(time_s) // 300)
    return time_s[::step], envelope[::step]
