"""Where a further damped exponential would explain most: likelihood ratios over pole places.

For each decay of a geometric series the residual is multiplied by exp(-decay t) and transformed:
the matched filter of a damped exponential. Its power over the power noise would give, summed over
taps, is the gain in twice the log-likelihood: chi-squared with 2 K degrees of freedom in noise.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.decays import damped
from fieldkit.signal.decimation import decimate
from fieldkit.signal.traces import Trace

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

FALSE_PER_SCAN = 1e-3
GREATEST_DAMPING = 0.25
SLOW_DAMPING = 3e-3
"""At the end of the reported range: decays below this one's are the slow ones."""
MOST_AT_ONCE = 8
_SETTLE_S = 0.003
_LEVEL_BLOCK = 96
_LEVEL_QUANTILE = 0.25


@dataclass(frozen=True)
class Candidate:
    """A place where a mode may be."""

    pole: complex
    gain: float
    """Gain in twice the log-likelihood, all taps."""
    clear: float
    """The gain over how far its surroundings stand above the noise."""


@dataclass(frozen=True)
class Region:
    """What is searched."""

    low_hz: float
    high_hz: float
    slowest_per_s: float
    """Smallest decay in the bank."""
    slow_high_hz: float
    """Up to where what decays slowly is searched."""


def scan(leftovers: Sequence[Trace], region: Region, most: int = MOST_AT_ONCE) -> list[Candidate]:
    """Candidates above the threshold, strongest first, none in the skirt of a stronger one.

    ``leftovers`` are the taps with what is known already taken out. What decays slowly is looked
    for in and just above the reported range only: farther up it spoils nothing there.
    """
    rows: list[tuple[Complex, Real, Real]] = []
    cells = 0
    decay = region.slowest_per_s
    lowered = [at_lower_rate(t, region.slow_high_hz) for t in leftovers]
    while decay <= GREATEST_DAMPING * 2 * np.pi * region.high_hz:
        slow = decay < SLOW_DAMPING * 2 * np.pi * region.slow_high_hz
        traces, top_hz = (lowered, region.slow_high_hz) if slow else (leftovers, region.high_hz)
        frequency_hz, gain, clear = gain_over_frequency(traces, decay, top_hz)
        lowest = max(region.low_hz, decay / (2 * np.pi * GREATEST_DAMPING))
        keep = (frequency_hz >= lowest) & (frequency_hz <= top_hz)
        cells += int(np.count_nonzero(keep))
        rows.append(peaks(frequency_hz[keep], gain[keep], clear[keep], decay))
        decay *= 2
    if not rows:
        return []
    pole, gain, clear = (np.concatenate(column) for column in zip(*rows, strict=True))
    over = np.flatnonzero(clear > threshold(len(leftovers), cells))
    found = [Candidate(complex(pole[i]), float(gain[i]), float(clear[i])) for i in over]
    return apart(found, most)


def at_lower_rate(trace: Trace, high_hz: float) -> Trace:
    """The trace at a rate just high enough for what lies below ``high_hz``."""
    samples, rate_hz = decimate(
        trace.samples, trace.rate_hz, keep_hz=high_hz, wanted_rate_hz=3 * high_hz
    )
    return trace if samples is trace.samples else Trace(samples, rate_hz, trace.noise)


def threshold(taps: int, cells: int) -> float:
    """Gain that noise passes with chance FALSE_PER_SCAN in a scan of so many cells."""
    from scipy.special import chdtri

    return float(chdtri(2 * taps, FALSE_PER_SCAN / max(cells, 1)))


def gain_over_frequency(
    traces: Sequence[Trace], decay: float, top_hz: float
) -> tuple[Real, Real, Real]:
    """(m,) frequencies up to top, gains, and gains over their surroundings, for one decay."""
    longest = max(t.duration_s for t in traces)
    span_s = fast_span_s(8 / decay if 8 / decay < longest else 2 * longest, traces[0].rate_hz)
    count = int(min(top_hz * span_s + 2, min(round(span_s * t.rate_hz) // 2 + 1 for t in traces)))
    rates = {t.rate_hz for t in traces}
    windows = {rate: decay_window(round(span_s * rate), decay, rate) for rate in rates}
    gains = [tap_gain(t, windows[t.rate_hz], span_s, count) for t in traces]
    total = np.sum(gains, axis=0)
    return np.arange(count) / span_s, total, total / excess(total, 2.0 * len(traces))


def fast_span_s(span_s: float, rate_hz: float) -> float:
    """The next longer span whose number of samples has a fast transform."""
    from scipy.fft import next_fast_len

    return next_fast_len(max(int(np.ceil(span_s * rate_hz)), 8), real=True) / rate_hz


def tap_gain(trace: Trace, window: Real, span_s: float, count: int) -> Real:
    """(count,) gain of one tap on frequencies 1 / span_s apart."""
    used = window[: len(trace.samples)]
    spectrum = np.fft.rfft(used * trace.samples[: len(used)], len(window))[:count]
    power = spectrum.real**2 + spectrum.imag**2
    density = trace.noise.on_grid(1 / span_s, count)
    return np.asarray(power * (4 / (trace.rate_hz * (used @ used))) / density)


def decay_window(count: int, decay: float, rate_hz: float) -> Real:
    """(count,) exp(-decay t) with a half-cosine rise over its first moments.

    There leftovers of the contact may stand.
    """
    window = damped(-decay / rate_hz, count).real
    rise_s = min(_SETTLE_S, 0.1 / decay)
    time_s = np.arange(min(int(rise_s * rate_hz) + 1, count)) / rate_hz
    window[: len(time_s)] *= 0.5 - 0.5 * np.cos(np.pi * np.minimum(time_s / rise_s, 1.0))
    return np.asarray(window)


def low_quantile(blocks: Real) -> Real:
    """(b,) the level's quantile of each of (b, _LEVEL_BLOCK) blocks."""
    below, share = divmod(_LEVEL_QUANTILE * (_LEVEL_BLOCK - 1), 1)
    at = int(below)
    ranked = np.partition(blocks, (at, at + 1), axis=1)
    return np.asarray(ranked[:, at] + share * (ranked[:, at + 1] - ranked[:, at]))


def excess(gain: Real, degrees: float) -> Real:
    """How far the surroundings of each bin stand above what noise gives; at least 1.

    A low quantile of wide blocks, so that the skirt of a strong mode does not hide the mode itself.
    """
    from scipy.special import chdtri

    expected = float(chdtri(degrees, 1 - _LEVEL_QUANTILE))
    blocks = len(gain) // _LEVEL_BLOCK
    if blocks < 2:
        return np.full_like(gain, max(np.quantile(gain, _LEVEL_QUANTILE) / expected, 1.0))
    used = gain[: blocks * _LEVEL_BLOCK].reshape(blocks, _LEVEL_BLOCK)
    low = low_quantile(used)
    edged = np.concatenate([low[1:2], low, low[-2:-1]])
    level = np.minimum(low, np.maximum(edged[:-2], edged[2:]))
    centres = (np.arange(blocks) + 0.5) * _LEVEL_BLOCK
    smooth = np.interp(np.arange(len(gain)), centres, level)
    return np.asarray(np.maximum(smooth / expected, 1.0))


def peaks(frequency_hz: Real, gain: Real, clear: Real, decay: float) -> tuple[Complex, Real, Real]:
    """(c,) poles, gains, and gains over their surroundings, of local maxima of one bank row."""
    if len(gain) < 3:
        return np.zeros(0, complex), np.zeros(0), np.zeros(0)
    inner = gain[1:-1]
    at = np.flatnonzero((inner > gain[:-2]) & (inner >= gain[2:])) + 1
    at = at[np.argsort(gain[at])[::-1][:60]]
    return np.asarray(2j * np.pi * frequency_hz[at] - decay), gain[at], clear[at]


def apart(candidates: list[Candidate], most: int) -> list[Candidate]:
    """The strongest ones that are not the skirt of a stronger one."""
    chosen: list[Candidate] = []
    for one in sorted(candidates, key=lambda c: -c.gain):
        if len(chosen) == most:
            break
        if all(one.gain > 6 * skirt(other, one) for other in chosen):
            chosen.append(one)
    return chosen


def skirt(strong: Candidate, weak: Candidate) -> float:
    """Gain a strong pole leaks into the matched filter of a weaker one's place."""
    width = (strong.pole.real + weak.pole.real) ** 2
    distance = (strong.pole.imag - weak.pole.imag) ** 2
    return strong.gain * width / (width + distance) * 4
