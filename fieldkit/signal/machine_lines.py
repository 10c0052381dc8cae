"""Take the lines of a machine out of a running record, without harm to a mode beside them.

A line is told from a lightly damped mode by what it does over time: a machine holds its level,
and mostly its phase, while a mode that random forces stir does neither. It is modelled as a sine
of steady level whose phase may wander slowly, and subtracted; the few bins it stood on are then
left out of every fit, as missing data.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.steadiness import is_steady

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

PROMINENT = 24.0
"""Over the median around it; a bin of noise gets there in one of 10^7."""
_AROUND_BINS = 14
_WANDER = 0.002
"""Half the width, relative, that a wandering line is looked for in."""
_WIDTH_BINS = 3.0
_COHERENT = 0.9
"""Four quarters in phase to this degree show a steady sine."""
_STEADY_PHASE = 0.98
_NARROW = 0.7
_MOST_LINES = 80
_TIMES_OVER = 2


@dataclass(frozen=True)
class MachineLine:
    """A line that was taken out."""

    frequency_hz: float
    rms: float
    half_width_hz: float
    """To both sides nothing is believed."""


def without_lines(
    signal: Real, rate_hz: float, known_hz: Sequence[float] = ()
) -> tuple[Real, tuple[MachineLine, ...]]:
    """The signal (n,) less its machine lines, and the lines; ``known_hz`` are looked at too.

    Gone through twice: a strong line hides weak ones beside it.
    """
    lines: list[MachineLine] = []
    for turn in range(_TIMES_OVER):
        power = hann_power(signal)
        candidates = _candidates(power, len(signal), rate_hz, known_hz if turn == 0 else ())
        new = [f for f in candidates if not any(_covers(line, f) for line in lines)]
        told = [(f, line_width(signal, power, rate_hz, f, new)) for f in new]
        for frequency_hz, half_width_hz in told:
            if half_width_hz is None:
                continue
            part = _tracked(signal, rate_hz, frequency_hz, half_width_hz)
            signal = signal - part
            rms = float(np.sqrt(np.mean(part**2)))
            lines.append(MachineLine(frequency_hz, rms, half_width_hz))
    return signal, tuple(sorted(lines, key=lambda line: line.frequency_hz))


def _covers(line: MachineLine, frequency_hz: float) -> bool:
    return abs(line.frequency_hz - frequency_hz) <= line.half_width_hz


def _candidates(power: Real, count: int, rate_hz: float, known_hz: Sequence[float]) -> list[float]:
    """Frequencies of prominent peaks and of what is known, strongest first, apart from another."""
    step_hz = rate_hz / count
    inside = np.arange(2, len(power) - 2)
    top = (power[inside] > power[inside - 1]) & (power[inside] >= power[inside + 1])
    bins = inside[top & (power[inside] > PROMINENT * _around(power)[inside])]
    known = [_highest_near(power, f / step_hz) for f in known_hz if 0 < f < 0.49 * rate_hz]
    ranked = sorted({*bins.tolist(), *known}, key=lambda k: -power[k])
    kept: list[float] = []
    for k in ranked:
        frequency_hz = step_hz * _refined(power, k)
        apart = half_width(frequency_hz, count / rate_hz)
        if all(abs(frequency_hz - other) > apart for other in kept):
            kept.append(frequency_hz)
    return kept[:_MOST_LINES]


def hann_power(signal: Real) -> Real:
    """Periodogram of the whole record under a Hann window."""
    window = 0.5 - 0.5 * np.cos(2 * np.pi * (np.arange(len(signal)) + 0.5) / len(signal))
    return np.asarray(np.abs(np.fft.rfft(window * signal)) ** 2)


def _around(power: Real) -> Real:
    """Median of the bins around each bin, from medians of blocks joined by straight lines."""
    size = 2 * _AROUND_BINS
    blocks = power[: len(power) // size * size].reshape(-1, size)
    centres = (np.arange(len(blocks)) + 0.5) * size - 0.5
    return np.interp(np.arange(len(power)), centres, np.median(blocks, axis=1))


def _highest_near(power: Real, place: float) -> int:
    reach = max(2, round(0.002 * place))
    low = max(2, round(place) - reach)
    high = min(len(power) - 2, round(place) + reach + 1)
    return low + int(np.argmax(power[low:high]))


def _refined(power: Real, k: int) -> float:
    """Place of the top of a parabola through three logarithms."""
    left, middle, right = np.log(np.maximum(power[k - 1 : k + 2], 1e-300))
    curvature = left - 2 * middle + right
    return k + (0.0 if curvature == 0 else float(0.5 * (left - right) / curvature))


def half_width(frequency_hz: float, duration_s: float) -> float:
    """Half the width of a line whose speed wanders."""
    return _WANDER * frequency_hz + _WIDTH_BINS / duration_s


def line_width(
    signal: Real, power: Real, rate_hz: float, frequency_hz: float, others_hz: Sequence[float]
) -> float | None:
    """Half the width of a machine line at a frequency, None where no line is there."""
    duration_s = len(signal) / rate_hz
    wide = half_width(frequency_hz, duration_s)
    place = frequency_hz * duration_s
    coherence, prominence = quarter_coherence(signal, rate_hz, frequency_hz), height(power, place)
    if coherence > _COHERENT and prominence > PROMINENT:
        return _WIDTH_BINS / duration_s if coherence > _STEADY_PHASE else wide
    next_hz = min((abs(f - frequency_hz) for f in others_hz if f != frequency_hz), default=np.inf)
    steady = is_steady(signal, rate_hz, frequency_hz, max(next_hz, 4 * wide))
    narrow = _share_inside(power, place, wide * duration_s) > _NARROW
    return wide if steady and narrow else None


def quarter_coherence(signal: Real, rate_hz: float, frequency_hz: float) -> float:
    """Length of the sum of four quarters' phasors over the sum of their lengths."""
    n = len(signal) // 4 * 4
    phasors = _demodulated(signal, rate_hz, frequency_hz)[:n].reshape(4, -1).mean(axis=1)
    return float(abs(phasors.sum()) / max(float(np.abs(phasors).sum()), 1e-300))


def height(power: Real, place: float) -> float:
    """Highest of three bins about a place over the median of those around them."""
    near, k = _near(power, place, _AROUND_BINS)
    around = np.concatenate([near[: k - 3], near[k + 4 :]])
    return float(near[k - 1 : k + 2].max() / max(float(np.median(around)), 1e-300))


def _near(power: Real, place: float, reach: int) -> tuple[Real, int]:
    """Bins of a periodogram ``reach`` to both sides, and which of them is in the middle."""
    k = min(max(round(place), 4), len(power) - 5)
    low = max(0, k - reach)
    return power[low : k + reach + 1], k - low


def _share_inside(power: Real, place: float, half_bins: float) -> float:
    """Power near a line as a share of that within three times the distance."""
    half = max(1, round(half_bins))
    near, k = _near(power, place, 3 * half)
    inside = near[max(0, k - half) : k + half + 1]
    return float(inside.sum() / max(float(near.sum()), 1e-300))


def _demodulated(signal: Real, rate_hz: float, frequency_hz: float) -> Complex:
    turns = np.exp(-2j * np.pi * frequency_hz / rate_hz * np.arange(len(signal)))
    return np.asarray(2 * signal * turns)


def _tracked(signal: Real, rate_hz: float, frequency_hz: float, half_hz: float) -> Real:
    """(n,) the line as a sine whose level drifts at most in a straight line, phase followed."""
    base = _demodulated(signal, rate_hz, frequency_hz)
    duration_s = len(signal) / rate_hz
    steady = half_hz <= _WIDTH_BINS / duration_s
    turned = np.ones(len(signal), dtype=complex) if steady else _phase(base, rate_hz, half_hz)
    level = _straight_line(base * turned.conjugate())
    back = np.exp(2j * np.pi * frequency_hz / rate_hz * np.arange(len(signal)))
    return np.asarray((level * turned * back).real)


def _straight_line(values: Complex) -> Complex:
    x = np.linspace(-1.0, 1.0, len(values))
    return np.asarray(values.mean() + x * (x @ values) / (x @ x))


def _phase(base: Complex, rate_hz: float, half_hz: float) -> Complex:
    """(n,) unit phasors that follow a demodulated line within a band about 0 Hz."""
    block = max(1, int(rate_hz / (12 * half_hz)))
    count = max(len(base) // block, 1)
    means = base[: count * block].reshape(count, -1).mean(axis=1)
    bell = np.hanning(15)[1:-1]
    weight = np.convolve(np.ones(count), bell, mode="same")
    smooth = np.convolve(means, bell, mode="same")[:count] / weight[:count]
    at = (np.arange(count) + 0.5) * block
    angle = np.unwrap(np.angle(smooth))
    return np.asarray(np.exp(1j * np.interp(np.arange(len(base)), at, angle)))
