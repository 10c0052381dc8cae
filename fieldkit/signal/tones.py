"""Steady lines in the background: mains and its multiples, a machine that still runs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.background import NoiseDensity, detrended, periodograms
from fieldkit.signal.bands import band, subtract
from fieldkit.signal.likelihood import fit, inverse
from fieldkit.signal.traces import Component, Trace, component, residual

Real = NDArray[np.float64]

FALSE_PER_BACKGROUND = 1e-3
_PADDING = 4
_MOST_TONES = 40
_DIES_AWAY = 0.15
"""Decays over the background, and the relative standard deviation it must be known with."""
_SURELY = 0.12
_WANDERS = 2.5
_TURNS_AWAY = 0.3
"""Phase, in radians over a tap, by which a tone has to run off before its frequency follows."""
_UNEXPLAINED = 1e-3
_STANDS_OVER = 6.0
WANDERING_WIDTH = 4.0
"""Resolutions of the background over which the line of what wanders is spread."""
_FARTHEST_WANDER = 6e-3


@dataclass(frozen=True)
class Line:
    """A steady line of the background."""

    frequency_hz: float
    amplitude: float
    resolution_hz: float
    """One over the length of background it was read from."""
    wanders: bool = False
    """True where no steady line explains it: its frequency or level moves."""


def background_lines(
    samples: Real, rate_hz: float, noise: NoiseDensity, high_hz: float
) -> tuple[Line, ...]:
    """Lines of a quiet stretch that stand clear of its noise, strongest first."""
    from scipy.special import chdtri

    count = len(samples)
    window = np.blackman(count + 1)[:-1]
    spectrum = np.fft.rfft(window * detrended(samples), _PADDING * count)
    frequency_hz = np.arange(len(spectrum)) * rate_hz / (_PADDING * count)
    expected = noise.at(np.maximum(frequency_hz, 1e-6)) * rate_hz * np.sum(window**2) / 4
    score = np.abs(spectrum) ** 2 / expected
    least = float(chdtri(2, FALSE_PER_BACKGROUND / max(count * high_hz * 2 / rate_hz, 1)))
    inner = score[1:-1]
    tops = (inner > score[:-2]) & (inner >= score[2:]) & (inner > 1.5 * least)
    at = np.flatnonzero(tops & (frequency_hz[1:-1] < high_hz)) + 1
    resolution_hz = rate_hz / count
    lines: list[Line] = []
    for i in at[np.argsort(score[at])[::-1]]:
        line = interpolated(spectrum, int(i), rate_hz / (_PADDING * count), window, resolution_hz)
        if clear_of(line, lines) and len(lines) < _MOST_TONES:
            lines.append(line)
    return tuple(lines)


def interpolated(
    spectrum: NDArray[np.complex128], at: int, spacing_hz: float, window: Real, resolution_hz: float
) -> Line:
    """The top of a peak by a parabola through three log magnitudes."""
    low, top, high = np.log(np.abs(spectrum[at - 1 : at + 2]) + 1e-300)
    shift = 0.5 * (low - high) / min(low - 2 * top + high, -1e-12)
    amplitude = 2 * np.exp(top - 0.25 * (low - high) * shift) / window.sum()
    return Line(float((at + shift) * spacing_hz), float(amplitude), resolution_hz)


def clear_of(line: Line, stronger: Sequence[Line]) -> bool:
    """False within the window's main lobe or first side lobes of a much stronger line."""
    return all(
        abs(line.frequency_hz - s.frequency_hz) > 4 * line.resolution_hz
        and line.amplitude > 2e-3 * s.amplitude
        for s in stronger
        if abs(line.frequency_hz - s.frequency_hz) < 12 * line.resolution_hz
    )


def dies_away(line: Line, background: Trace) -> bool:
    """True for a line of the background that is the last of an earlier blow's ringing."""
    start = component(complex(-0.5 * line.resolution_hz, 2 * np.pi * line.frequency_hz), 1)
    reach = 12 * line.resolution_hz
    low, high = max(line.frequency_hz - reach, 0.0), line.frequency_hz + reach
    bins = band([background], low, high, background.duration_s)
    result = fit(bins, [start], leftover_terms=1)
    decay = result.active[0].decay_per_s
    sd_of_log = np.sqrt(inverse(result.information)[1, 1] * max(result.variance, 1.0))
    return bool(decay * background.duration_s > _DIES_AWAY and sd_of_log < _SURELY)


def wanders(line: Line, background: Trace) -> bool:
    """True where a steady line, slowly changing at most, leaves far more than noise.

    It must also leave a good part of the line itself, as no strong steady one does.
    """
    tone = component(2j * np.pi * line.frequency_hz, 1, steady=True)
    reach = 12 * line.resolution_hz
    low, high = max(line.frequency_hz - reach, 0.0), line.frequency_hz + reach
    bins = band([background], low, high, background.duration_s)
    whole = float(np.sum(np.abs(bins.data) ** 2))
    result = fit(bins, [], [tone], leftover_terms=1)
    return result.variance > _WANDERS and result.cost > _UNEXPLAINED * whole


def swing(line: Line, background: Trace) -> float:
    """Amplitude of all that stands about a line that wanders: more than its top shows."""
    count = background.fast_whole
    power = periodograms(background.samples[-count:], count, background.rate_hz)[0]
    spacing_hz = background.rate_hz / count
    apart_hz = np.abs(np.arange(len(power)) * spacing_hz - line.frequency_hz)
    near = apart_hz < WANDERING_WIDTH * line.resolution_hz
    return max(line.amplitude, float(np.sqrt(2 * power[near].sum() * spacing_hz)))


def wandering_density(lines: Sequence[Line], background: Trace) -> NoiseDensity | None:
    """Density of what the lines that wander leave beside steady ones, 0 between them.

    None where no line wanders.
    """
    moving = [line for line in lines if line.wanders]
    if not moving:
        return None
    left = residual(background, 0, tone_components(lines, [background]))
    count = background.fast_whole
    power = periodograms(left[-count:], count, background.rate_hz)[0]
    frequency_hz = np.arange(len(power)) * background.rate_hz / count
    floor = background.noise.at(frequency_hz)
    widened = np.maximum(np.maximum(power, np.roll(power, 1)), np.roll(power, -1))
    near = np.zeros(len(power), bool)
    for line in moving:
        near |= np.abs(frequency_hz - line.frequency_hz) < reach_hz(line)
    out = np.where(near & (widened > _STANDS_OVER * floor), widened, 0.0)
    return NoiseDensity(frequency_hz[1:], out[1:])


def reach_hz(line: Line) -> float:
    """How far from its top a line that wanders may stand at another time."""
    return max(_FARTHEST_WANDER * line.frequency_hz, 6 * line.resolution_hz)


def tone_components(lines: Sequence[Line], traces: Sequence[Trace]) -> list[Component]:
    """The lines as steady components, their amplitudes fitted to each tap."""
    parts = [component(2j * np.pi * line.frequency_hz, len(traces), steady=True) for line in lines]
    for _ in range(2):
        parts = [refitted(p, [o for o in parts if o is not p], traces) for p in parts]
    return parts


def refitted(tone: Component, others: Sequence[Component], traces: Sequence[Trace]) -> Component:
    """A tone with its amplitude and slow wander fitted anew beside the present others."""
    duration_s = max(t.duration_s for t in traces)
    reach = 16 / duration_s
    bins = band(traces, max(tone.frequency_hz - reach, 0), tone.frequency_hz + reach, duration_s)
    result = fit(subtract(bins, others), [], [tone], leftover_terms=2)
    return centred(result.passive[0], np.array([t.duration_s for t in traces]))


def centred(tone: Component, duration_s: Real) -> Component:
    """The tone at the frequency it has amid each tap, as far as its slope tells."""
    half = duration_s / 2
    middle = tone.amplitudes + tone.slopes * half
    strong = np.abs(middle) > np.abs(tone.slopes * half)
    turn = np.where(strong, (tone.slopes / np.where(strong, middle, 1)).imag, 0.0)
    turn = np.where(np.abs(turn) * duration_s > _TURNS_AWAY, turn, 0.0)
    back = np.exp(-1j * turn * half)
    slopes = (tone.slopes - 1j * turn * middle) * back
    amplitudes = middle * back - slopes * half
    return replace(tone, poles=tone.poles + 1j * turn, amplitudes=amplitudes, slopes=slopes)
