"""Whether what looks like a mode in a running record is one, and how sure its values are."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.covariance import Estimate, values_by_parameters
from fieldkit.signal.machine_lines import PROMINENT, MachineLine, height, quarter_coherence
from fieldkit.signal.periodogram import Periodogram
from fieldkit.signal.running_search import Stirred, spectrum_of, split, zone_of
from fieldkit.signal.whittle import ROUGH, covariance_of, fit_zone

Real = NDArray[np.float64]

_SEEN_IN_HALF = 7.0
"""Twice the log-likelihood it brings in each half of the record."""
_HALVES_DIFFER = 4.0
_HALVES_WIDEN = 2.5
"""Standard deviations between the halves from which they contradict, or widen, each other."""
_MOST_DAMPING = 0.08
"""Far beyond what pipework at these amplitudes shows (common practice, no source)."""
_DAMPING_DOUBT = 0.5
_LINE_RATIO = 1.25
_COHERENT = 0.95
_LEAST_WIDTH = 1.2e-3
_BESIDE_LINE, _LIKE_LINE = 5.0, 2.2
"""Within this many half widths of a line, and narrower than this many, it may be its foot."""
_MAYBE_TWO = 13.3
"""99 % point of chi-square with four degrees of freedom."""
_WIDER, _WIDER_PER_DECAY = 1.08, 1.5
"""Deviations from the Fisher information are a little small where few decays fit into the record:
by simulation."""
_CROWDED = 1.3
_CROWDED_WIDTHS = 2.0


@dataclass(frozen=True)
class Record:
    """What modes are judged on: the record without machine lines, and its spectra."""

    signal: Real
    rate_hz: float
    lines: tuple[MachineLine, ...]
    whole: Periodogram
    halves: tuple[Periodogram, ...]

    @classmethod
    def of(cls, signal: Real, rate_hz: float, lines: tuple[MachineLine, ...]) -> Record:
        """With the spectra of the whole (n,) and of both halves."""
        first, second = np.array_split(signal, 2)
        return cls(
            signal,
            rate_hz,
            lines,
            Periodogram.of(signal, rate_hz, lines),
            (Periodogram.of(first, rate_hz, lines), Periodogram.of(second, rate_hz, lines)),
        )


@dataclass(frozen=True)
class Judged:
    """A candidate with its values and what speaks against it."""

    frequency_hz: Estimate
    damping_ratio: Estimate
    mean_square: float
    reason: str = ""
    maybe_two: bool = False


def judged(modes: Sequence[Stirred], record: Record) -> list[Judged]:
    """Values, standard deviations and the first objection to each mode, if there is one."""
    ratios = [envelope_ratio(mode, record) for mode in modes]
    unsteady = float(np.sqrt(max(1.0, np.median(ratios) / 2))) if ratios else 1.0
    return [
        _judged(mode, [m for m in modes if m is not mode], record, ratio, unsteady)
        for mode, ratio in zip(modes, ratios, strict=True)
    ]


def _judged(
    mode: Stirred, others: Sequence[Stirred], record: Record, ratio: float, unsteady: float
) -> Judged:
    """``unsteady`` is how much a level that changes widens every deviation."""
    parts = [_in_half(half, mode, others) for half in record.halves]
    apart = _apart(parts)
    decays = -mode.pole.real * record.whole.duration_s
    wider = _WIDER + _WIDER_PER_DECAY / decays
    sd = wider * unsteady * np.sqrt(np.diag(_value_covariance(mode)))
    sd = sd * np.maximum(apart / _HALVES_WIDEN, 1.0)
    crowded = any(_overlap(mode, other) for other in others)
    two = not crowded and split(record.whole, mode, others)[1] > _MAYBE_TWO
    if crowded:
        sd = _CROWDED * sd
    if two:
        sd = np.hypot(sd, [0.25 * mode.width_hz, 0.25 * mode.damping_ratio])
    reason = _line(mode, record, ratio) or _shape(mode, sd) or _halves(parts, apart)
    return Judged(
        Estimate(mode.frequency_hz, float(sd[0])),
        Estimate(mode.damping_ratio, float(sd[1])),
        mode.mean_square,
        reason,
        two,
    )


def _overlap(mode: Stirred, other: Stirred) -> bool:
    reach = _CROWDED_WIDTHS * max(mode.width_hz, other.width_hz)
    return abs(mode.frequency_hz - other.frequency_hz) < reach


def _value_covariance(mode: Stirred) -> Real:
    to_values = values_by_parameters(-mode.pole.real, mode.pole.imag)
    return np.asarray(to_values @ mode.covariance @ to_values.T)


@dataclass(frozen=True)
class _Half:
    """A mode as one half of the record shows it."""

    values: Real
    """(2,) natural frequency and damping ratio."""
    variance: Real
    """(2,)"""
    gain: float


def _in_half(half: Periodogram, mode: Stirred, others: Sequence[Stirred]) -> _Half:
    zone = zone_of(half, [mode.pole])
    if zone is None:
        return _Half(np.array([mode.frequency_hz, mode.damping_ratio]), np.full(2, np.inf), 0.0)
    held = spectrum_of(zone, others)
    fit = fit_zone(zone, [mode.pole], held, finished=ROUGH)
    without = fit_zone(zone, [], held, finished=ROUGH)
    pole = complex(fit.poles[0])
    to_values = values_by_parameters(-pole.real, pole.imag)
    covariance = covariance_of(fit.information)[:2, :2]
    return _Half(
        np.array([abs(pole) / (2 * np.pi), -pole.real / abs(pole)]),
        np.diag(to_values @ covariance @ to_values.T),
        2 * (without.cost - fit.cost) if fit.amplitudes[0, 0] > 0 else 0.0,
    )


def _apart(parts: Sequence[_Half]) -> Real:
    """(2,) difference of frequency and damping of two halves over its deviation."""
    variance = parts[0].variance + parts[1].variance
    return np.asarray(np.abs(parts[0].values - parts[1].values) / np.sqrt(variance + 1e-300))


def _line(mode: Stirred, record: Record, ratio: float) -> str:
    """Whether a machine makes it: fourth moment of the level, phase, width, lines beside it."""
    frequency_hz = mode.pole.imag / (2 * np.pi)
    coherence = quarter_coherence(record.signal, record.rate_hz, frequency_hz)
    in_phase = (
        coherence > _COHERENT
        and height(record.whole.power, frequency_hz * record.whole.duration_s) > PROMINENT
    )
    narrow = mode.width_hz < _LEAST_WIDTH * mode.frequency_hz
    if ratio < _LINE_RATIO or narrow or in_phase:
        return "a machine line: it holds its level or phase, as no mode stirred at random does"
    if any(_skirt(mode, line) for line in record.lines):
        return "the foot of a machine line whose speed wanders: no wider than the line itself"
    return ""


def _skirt(mode: Stirred, line: MachineLine) -> bool:
    """Whether it is narrow, beside a stronger line, and may be what the line's model left over."""
    return (
        abs(mode.frequency_hz - line.frequency_hz) < _BESIDE_LINE * line.half_width_hz
        and mode.width_hz < _LIKE_LINE * line.half_width_hz
        and mode.mean_square < line.rms**2
    )


def envelope_ratio(mode: Stirred, record: Record) -> float:
    """Mean fourth power of the envelope over its squared mean square, 1 for a sine, 2 for noise."""
    signal, rate_hz = record.signal, record.rate_hz
    n = int(min(len(signal) / 16, 0.35 * rate_hz / mode.width_hz))
    n = max(n, int(4 * rate_hz / mode.frequency_hz))
    seen = np.hanning(n + 2)[1:-1] * np.exp(-1j * mode.pole.imag / rate_hz * np.arange(n))
    starts = np.linspace(0, len(signal) - n, min(400, 2 * len(signal) // n)).astype(int)
    parts = np.lib.stride_tricks.sliding_window_view(signal, n)[starts]
    power = np.abs(parts @ seen) ** 2
    return float(np.mean(power**2) / np.mean(power) ** 2)


def _shape(mode: Stirred, sd: Real) -> str:
    if mode.damping_ratio > _MOST_DAMPING:
        return "too broad for a mode of pipework: a hump of the background"
    if not sd[1] < _DAMPING_DOUBT * mode.damping_ratio:
        return "its damping is too uncertain in this record; record longer"
    return ""


def _halves(parts: Sequence[_Half], apart: Real) -> str:
    if min(part.gain for part in parts) < _SEEN_IN_HALF:
        return "not seen in both halves of the record"
    if apart.max() > _HALVES_DIFFER:
        return "differs between the two halves of the record by more than chance explains"
    return ""
