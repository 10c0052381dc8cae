"""One blow of a guided tap test: can it be used, and if not, what to change."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.capture.calibration import strongest_hz
from fieldkit.capture.verdict import (
    CLIPPED,
    CUT_SHORT,
    DOUBLE,
    GAP,
    MACHINE,
    NO_BLOW,
    REFUSED,
    USABLE,
    WEAK,
    Verdict,
)
from fieldkit.signal.decimation import decimate
from fieldkit.signal.modes import TapRecord
from fieldkit.signal.spectrum import Spectrum, tap_spectrum
from fieldkit.signal.taps import Tap, TapSearch, cut, find_taps

Real = NDArray[np.float64]

_SAID = {
    "frames are missing": GAP,
    "clipped": CLIPPED,
    "struck twice": DOUBLE,
    "overlapped": DOUBLE,
    "too weak": WEAK,
    "cut short": CUT_SHORT,
}
"""Beginnings of the reasons not to use a tap; the first that is found gives the verdict."""

_SAME_BLOW_S = 0.1
_COLUMNS = 400
_SHOWN_BEFORE_S = 0.25
_SPECTRUM_RATE = 4.0
_STEADY_SHARE = 0.5
_LINES = 5
_LINE_BINS = 3
_DROWNS = 0.1
_LOUD = 0.02
_STRUCK_HARD = 0.1
_LEAST_BACKGROUND_S = 1.0
_GUARD_S = 0.03
_HOP_S = 0.01
_LEAST_OVER = 4.0
"""Peak of a blow over the median peak of the quiet before it: less tells of few modes."""


@dataclass(frozen=True, eq=False)
class Trace:
    """A decay for drawing: lowest and highest sample of each column."""

    start_s: float
    """Of the first column, from the blow; negative before it."""
    step_s: float
    low: Real
    """(n,)"""
    high: Real
    """(n,)"""


@dataclass(frozen=True, eq=False)
class BlowReading:
    """What a record of one blow says."""

    frame: int
    """Of the blow, in the count of the session."""
    verdict: Verdict
    peak: float
    """Largest absolute sample, full scale 1."""
    trace: Trace
    spectrum: Spectrum | None
    """Of what rings after it; None where there is nothing to transform."""
    record: TapRecord | None
    """For the estimation of modes; None where it does not count."""
    background: Real
    """(m,) of the record, without a blow."""


def read_blow(
    samples: NDArray[np.floating],
    rate_hz: float,
    blow: int,
    *,
    frame: int = 0,
    up_to_hz: float = 200.0,
    full_scale: float | None = 1.0,
    quiet: Real | None = None,
) -> BlowReading:
    """Judge the blow at index ``blow`` of a record (n,) that may hold the quiet before it.

    ``quiet`` is a background from elsewhere, used where the record has less than a second.
    """
    signal = np.asarray(samples, float)
    search = find_taps(signal, rate_hz, full_scale=full_scale)
    tap = _ours(search.taps, blow / rate_hz)
    background = signal[slice(*search.background)]
    before = signal[: max(blow - round(_GUARD_S * rate_hz), 0)]
    verdict = _verdict(search, tap, before, rate_hz)
    record = _record(signal, rate_hz, search, tap, quiet) if verdict.usable else None
    first, end = (tap.start, tap.end) if tap is not None else (blow, len(signal))
    return BlowReading(
        frame,
        verdict,
        tap.peak if tap is not None else float(np.abs(signal[blow:]).max(initial=0.0)),
        decay_trace(signal, rate_hz, blow),
        decay_spectrum(signal[first:end], rate_hz, up_to_hz),
        record,
        background,
    )


def decay_trace(samples: Real, rate_hz: float, blow: int) -> Trace:
    """What is drawn of a record: a little before the blow, and all behind it."""
    first = max(blow - round(_SHOWN_BEFORE_S * rate_hz), 0)
    shown = samples[first:]
    width = max(len(shown) // _COLUMNS, 1)
    columns = shown[: len(shown) // width * width].reshape(-1, width)
    start_s, step_s = (first - blow) / rate_hz, width / rate_hz
    return Trace(start_s, step_s, columns.min(axis=1), columns.max(axis=1))


def decay_spectrum(decay: Real, rate_hz: float, up_to_hz: float) -> Spectrum | None:
    """Spectrum of a decay up to a frequency, uncalibrated; None where nothing is there."""
    lowered, low_rate_hz = decimate(
        decay, rate_hz, keep_hz=up_to_hz, wanted_rate_hz=_SPECTRUM_RATE * up_to_hz
    )
    if len(lowered) < 2 or not np.any(lowered != lowered[0]):
        return None
    spectrum = tap_spectrum([lowered], low_rate_hz)
    kept = spectrum.frequency_hz <= up_to_hz
    return replace(
        spectrum, frequency_hz=spectrum.frequency_hz[kept], amplitude=spectrum.amplitude[kept]
    )


def _ours(taps: Sequence[Tap], at_s: float) -> Tap | None:
    nearest = min(taps, key=lambda tap: abs(tap.at_s - at_s), default=None)
    return nearest if nearest and abs(nearest.at_s - at_s) < _SAME_BLOW_S else None


def _verdict(search: TapSearch, tap: Tap | None, before: Real, rate_hz: float) -> Verdict:
    steady = steady_vibration(before, rate_hz)
    if tap is None:
        return _drowned(steady, 0.0) or Verdict(
            NO_BLOW, "something was heard, and it does not begin as a blow does"
        )
    later = [other.at_s - tap.at_s for other in search.taps if other.at_s > tap.at_s]
    for beginning, kind in _SAID.items():
        said = [reason for reason in tap.reasons if reason.startswith(beginning)]
        if kind == DOUBLE and later:
            return Verdict(DOUBLE, f"struck again {later[0]:.1f} s later, before it was armed")
        if said and kind == WEAK:
            return _drowned(steady, tap.peak) or Verdict(WEAK, _without_kind(said[0]))
        if said:
            return Verdict(kind, _without_kind(said[0]))
    if tap.reasons:
        return Verdict(REFUSED, tap.reasons[0].partition("; ")[0])
    return _hardly_over(before, rate_hz, tap.peak, steady) or Verdict(USABLE)


def _hardly_over(
    before: Real, rate_hz: float, peak: float, steady: tuple[float, float, float]
) -> Verdict | None:
    """Too weak where noise, not a machine, reaches nearly as high."""
    hop = max(round(_HOP_S * rate_hz), 1)
    if len(before) < _LEAST_BACKGROUND_S / 2 * rate_hz or steady[2] > _STEADY_SHARE:
        return None
    hops = (before - before.mean())[: len(before) // hop * hop].reshape(-1, hop)
    level = float(np.median(np.abs(hops).max(axis=1)))
    if peak >= _LEAST_OVER * level:
        return None
    return Verdict(WEAK, f"only {20 * np.log10(peak / level):.0f} dB over the noise before it")


def _drowned(steady: tuple[float, float, float], peak: float) -> Verdict | None:
    """Too weak, and not the blow's fault but that of what runs beside it."""
    line_hz, amplitude, share = steady
    drowned = share > _STEADY_SHARE and amplitude > _DROWNS * peak
    if drowned and (amplitude > _LOUD or peak > _STRUCK_HARD):
        return Verdict(MACHINE, f"a steady vibration, strongest at {line_hz:.1f} Hz, drowns it")
    return None


def _without_kind(reason: str) -> str:
    """What was seen, without its heading and without what to do about it."""
    return reason.partition("; ")[0].partition(": ")[2] or reason.partition("; ")[0]


def steady_vibration(background: Real, rate_hz: float) -> tuple[float, float, float]:
    """Frequency of the strongest line, amplitude of the whole, and the share of lines in it."""
    if len(background) < _LEAST_BACKGROUND_S / 2 * rate_hz:
        return 0.0, 0.0, 0.0
    centred = background - background.mean()
    power = np.abs(np.fft.rfft(centred * np.hanning(len(centred)))) ** 2
    total = float(power.sum())
    lines = 0.0
    for _ in range(_LINES):
        at = int(np.argmax(power))
        near = slice(max(at - _LINE_BINS, 0), at + _LINE_BINS + 1)
        lines += float(power[near].sum())
        power[near] = 0.0
    amplitude = float(np.sqrt(2) * centred.std())
    share = lines / total if total > 0 else 0.0
    return strongest_hz(background, rate_hz), amplitude, share


def _record(
    samples: Real, rate_hz: float, search: TapSearch, tap: Tap | None, quiet: Real | None
) -> TapRecord | None:
    if tap is None:
        return None
    record = cut(samples, rate_hz, replace(search, taps=(tap,)))[0]
    short = len(record.background) < _LEAST_BACKGROUND_S * rate_hz
    if short and quiet is not None and len(quiet) > len(record.background):
        return replace(record, background=quiet)
    return record
