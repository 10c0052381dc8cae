"""Find the blows in a tap recording and say which of them can be used."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.blows import (
    GUARD_S,
    SOFT_GUARD_S,
    Blow,
    find_blows,
    spectral_level,
    without_rattle,
)
from fieldkit.signal.first_moments import FirstMoments, first_moments
from fieldkit.signal.innovation import levels
from fieldkit.signal.modes import TapRecord
from fieldkit.signal.objections import Missing, gap_reason, objections
from fieldkit.signal.ringing import Ringing, ringing

Real = NDArray[np.float64]

_LEAST_QUIET_S = 0.5
_MORE_S = 0.5
_LEAST_RECORD_S = 2.0
_BLOCK_S = 0.05
_FLAT_TO = 0.35
"""Of its rate up to which a level still holds everything."""


@dataclass(frozen=True)
class Tap:
    """One blow inside a recording."""

    at_s: float
    start: int
    """First sample of the free decay: after the contact, before the ringing is lost."""
    end: int
    """One past the last sample that belongs to this blow."""
    peak: float
    """Largest absolute sample, in the samples' unit."""
    usable: bool
    reasons: tuple[str, ...] = ()
    """Why it is not usable, in words for the user; empty when it is."""

    def onset_guarded(self, rate_hz: float) -> int:
        """First sample surely before the blow."""
        return min(max(int((self.at_s - GUARD_S) * rate_hz), 0), self.start)


@dataclass(frozen=True)
class TapSearch:
    """The blows of one channel and what lies before them."""

    taps: tuple[Tap, ...]
    background: tuple[int, int]
    """Sample range without any blow: before the first one or after a full decay; may be empty."""
    noise_rms: float
    """Robust noise level of the background, in the samples' unit."""


def find_taps(
    signal: NDArray[np.floating],
    rate_hz: float,
    *,
    full_scale: float | None = 1.0,
    gaps: Sequence[Missing] = (),
) -> TapSearch:
    """Blows of a (n,) signal, each with why it cannot be used, and the background without any.

    ``full_scale`` is the sample value at which the input clips; None where it has no known rail (a
    rail is then told from flat tops). A blow with one of ``gaps`` in it cannot be used. Rates from
    100 Hz to 192 kHz.
    """
    samples = np.asarray(signal, float)
    if len(samples) < 16 or not np.any(samples != samples[0]):
        return TapSearch((), (0, len(samples)), 0.0)
    scales = levels(samples, rate_hz)
    duration_s = len(samples) / rate_hz
    blows = find_blows(scales)
    background_s = quiet_before(blows, duration_s)
    spectral = spectral_level(scales)
    picture = ringing(spectral, background_s)
    if background_s[1] - background_s[0] < _LEAST_QUIET_S:
        background_s = longest_quiet(blows, picture, background_s)
    firsts = first_moments(scales[0], _FLAT_TO * spectral.rate_hz, background_s)
    blows = without_rattle(blows, samples, rate_hz, full_scale)
    taps = tuple(read_blow(b, samples, rate_hz, picture, firsts, full_scale) for b in blows)
    background = (int(background_s[0] * rate_hz), int(background_s[1] * rate_hz))
    if gaps:
        taps = tuple(without_gaps(tap, gaps, rate_hz) for tap in taps)
        background = longest_whole(background, gaps)
    return TapSearch(taps, background, noise_level(samples, rate_hz, background))


def without_gaps(tap: Tap, gaps: Sequence[Missing], rate_hz: float) -> Tap:
    """The tap, unusable where frames are missing from just before the blow to its end."""
    first = max(int((tap.at_s - GUARD_S) * rate_hz), 0)
    reasons = (*gap_reason(first, tap.end, gaps, rate_hz), *tap.reasons)
    return replace(tap, usable=not reasons, reasons=reasons)


def longest_whole(span: tuple[int, int], gaps: Sequence[Missing]) -> tuple[int, int]:
    """The longest part of a range of samples in which none are missing."""
    first, end = span
    inside = [gap for gap in gaps if gap[1] > first and gap[0] < end]
    starts = [first, *(gap[1] for gap in inside)]
    ends = [*(gap[0] for gap in inside), end]
    parts = [(a, max(a, b)) for a, b in zip(starts, ends, strict=True)]
    return max(parts, key=lambda part: part[1] - part[0])


def cut(
    signal: NDArray[np.floating], rate_hz: float, search: TapSearch, source: str = ""
) -> tuple[TapRecord, ...]:
    """The free decays of the usable taps, each with the background they share."""
    samples = np.asarray(signal, float)
    background = samples[slice(*search.background)]
    return tuple(
        TapRecord(
            samples[t.start : t.end],
            rate_hz,
            background,
            source,
            before=samples[t.onset_guarded(rate_hz) : t.start],
            since_blow_s=t.start / rate_hz - t.at_s,
        )
        for t in search.taps
        if t.usable
    )


def quiet_before(blows: Sequence[Blow], duration_s: float) -> tuple[float, float]:
    """What lies before the first blow."""
    if not blows:
        return (0.0, duration_s)
    first = blows[0].onset
    guard_s = GUARD_S if first.rise_s == 0 else SOFT_GUARD_S
    return (0.0, max(first.at_s - guard_s, 0.0))


def longest_quiet(
    blows: Sequence[Blow], picture: Ringing, before_s: tuple[float, float]
) -> tuple[float, float]:
    """The longest stretch after a full decay, where that is longer than what lies before."""
    gaps = [before_s]
    for blow in blows:
        ended_s = picture.end_s(blow.onset.at_s, blow.limit_s) + _MORE_S
        gaps.append((ended_s, blow.limit_s - (0.0 if blow.last else GUARD_S)))
    return max(gaps, key=lambda g: g[1] - g[0])


def noise_level(samples: Real, rate_hz: float, background: tuple[int, int]) -> float:
    """Median RMS of short blocks of the background; of the quietest tenth where there is none."""
    length = max(int(_BLOCK_S * rate_hz), 4)
    quiet = samples[slice(*background)]
    share = 0.5 if len(quiet) >= length else 0.1
    quiet = quiet if len(quiet) >= length else samples
    blocks = max(len(quiet) // length, 1)
    rms = np.std(quiet[: blocks * length].reshape(blocks, -1), axis=1)
    return float(np.quantile(rms, share))


def read_blow(
    blow: Blow,
    samples: Real,
    rate_hz: float,
    picture: Ringing,
    firsts: FirstMoments,
    full_scale: float | None,
) -> Tap:
    """One blow as a tap: its free decay, and what speaks against it."""
    at_s = blow.onset.at_s
    start_s = at_s + blow.contact_s
    limit_s = blow.limit_s - (0.0 if blow.last else GUARD_S / 2)
    end_s = max(picture.end_s(start_s, limit_s) + _MORE_S, start_s + _LEAST_RECORD_S)
    end_s = max(min(end_s, limit_s), start_s)
    near = samples[max(int((at_s - GUARD_S) * rate_hz), 0) : int(end_s * rate_hz) + 1]
    reasons = objections(blow, picture, firsts, start_s, end_s, full_scale)
    start = min(int(np.ceil(start_s * rate_hz)), len(samples))
    end = max(min(int(end_s * rate_hz), len(samples)), start)
    peak = float(np.abs(near).max(initial=0.0))
    return Tap(at_s, start, end, peak, not reasons, tuple(reasons))
