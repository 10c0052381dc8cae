"""Find the blows in a tap recording and say which of them can be used."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.clipping import clipped_at
from fieldkit.signal.contact import LONGEST_GAP_S, Later, contact_end_s, later_blows, sharpest
from fieldkit.signal.innovation import Level, levels
from fieldkit.signal.modes import TapRecord
from fieldkit.signal.onsets import Onset, onsets
from fieldkit.signal.ringing import RINGS, Ringing, ringing
from fieldkit.signal.swells import swells

Real = NDArray[np.float64]

_DOUBLE_SHARE = 0.15
_GUARD_S = 0.03
_LEAST_QUIET_S = 0.5
_MORE_S = 0.5
_LEAST_RECORD_S = 2.0
_SHORTEST_RECORD_S = 0.2
_ENOUGH_DROP_DB = 9.0
_ENOUGH_OVERLAPPED_DB = 4.0
_ENOUGH_S = 3.0
_ENOUGH_OVERLAPPED_S = 1.0
_STILL_RINGS = 3 * RINGS
_BLOCK_S = 0.05
_RATTLE_S = 0.2
"""Clipped ringing goes on for as long after the last sample at the rail."""
_EDGE_S = 0.05


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


@dataclass(frozen=True)
class TapSearch:
    """The blows of one channel and what lies before them."""

    taps: tuple[Tap, ...]
    background: tuple[int, int]
    """Sample range without any blow: before the first one or after a full decay; may be empty."""
    noise_rms: float
    """Robust noise level of the background, in the samples' unit."""


@dataclass(frozen=True)
class Blow:
    """A blow with everything that strikes while it still rings."""

    onset: Onset
    later: tuple[Later, ...]
    limit_s: float
    """Where the next blow begins or the recording ends."""
    last: bool
    """True where the recording's end is the limit."""


def find_taps(
    signal: NDArray[np.floating], rate_hz: float, *, full_scale: float | None = 1.0
) -> TapSearch:
    """Blows of a (n,) signal, each with why it cannot be used, and the background without any.

    ``full_scale`` is the sample value at which the input clips; None where it has no known rail (a
    rail is then told from flat tops). Rates from 100 Hz to 192 kHz.
    """
    samples = np.asarray(signal, float)
    if len(samples) < 16 or not np.any(samples != samples[0]):
        return TapSearch((), (0, len(samples)), 0.0)
    scales = levels(samples, rate_hz)
    duration_s = len(samples) / rate_hz
    sharp = confirmed(onsets(scales), scales)
    soft = soft_onsets(scales, sharp)
    blows = grouped(sorted([*sharp, *soft], key=lambda o: o.at_s), scales, duration_s)
    background_s = quiet_before(blows, duration_s)
    picture = ringing(spectral_level(scales), background_s)
    if background_s[1] - background_s[0] < _LEAST_QUIET_S:
        background_s = longest_quiet(blows, picture, background_s)
    blows = without_rattle(blows, samples, rate_hz, full_scale)
    taps = tuple(read_blow(b, samples, rate_hz, scales, picture, full_scale) for b in blows)
    background = (int(background_s[0] * rate_hz), int(background_s[1] * rate_hz))
    return TapSearch(taps, background, noise_level(samples, rate_hz, background))


def cut(
    signal: NDArray[np.floating], rate_hz: float, search: TapSearch, source: str = ""
) -> tuple[TapRecord, ...]:
    """The free decays of the usable taps, each with the background they share."""
    samples = np.asarray(signal, float)
    background = samples[slice(*search.background)]
    return tuple(
        TapRecord(samples[t.start : t.end], rate_hz, background, source)
        for t in search.taps
        if t.usable
    )


def confirmed(found: Sequence[Onset], scales: Sequence[Level]) -> list[Onset]:
    """Onsets at which a predictor fitted nearby fails too, each at its refined time."""
    out: list[Onset] = []
    last_s = len(scales[0].samples) / scales[0].rate_hz - _EDGE_S
    for onset in found:
        slack_s = 4 / scales[onset.scale].rate_hz if onset.scale else 0.004
        place = sharpest(scales, onset.at_s, slack_s)
        if place is None or place.at_s > last_s:
            continue
        if not (out and place.at_s - out[-1].at_s < slack_s):
            out.append(replace(onset, at_s=place.at_s))
    return out


def grouped(found: Sequence[Onset], scales: Sequence[Level], duration_s: float) -> list[Blow]:
    """Onsets that follow each other within the ringing of a double blow, as one blow."""
    firsts: list[Onset] = []
    for onset in found:
        if not firsts or onset.at_s - firsts[-1].at_s > LONGEST_GAP_S:
            firsts.append(onset)
    limits = [*(o.at_s for o in firsts[1:]), duration_s][: len(firsts)]
    return [
        Blow(o, tuple(all_later(o, found, scales, limit)), limit, o is firsts[-1])
        for o, limit in zip(firsts, limits, strict=True)
    ]


def all_later(
    first: Onset, found: Sequence[Onset], scales: Sequence[Level], limit_s: float
) -> list[Later]:
    """Later blows by either detector."""
    close = later_blows(scales, first.at_s, limit_s) if first.rise_s == 0 else []
    for onset in found:
        after_s = onset.at_s - first.at_s
        new = all(abs(after_s - c.after_s) > 0.015 for c in close)
        if 0 < after_s <= LONGEST_GAP_S and onset.scale == first.scale and new:
            close.append(Later(after_s, onset.strength / first.strength))
    return sorted(close, key=lambda c: c.after_s)


def spectral_level(scales: Sequence[Level]) -> Level:
    """The coarsest level whose band still holds what rings up to some hundred hertz."""
    return [s for s in scales if s is scales[0] or s.rate_hz >= 800][-1]


def soft_onsets(scales: Sequence[Level], sharp: Sequence[Onset]) -> list[Onset]:
    """Blows that show only as a line that swells over the quietest moments."""
    level = spectral_level(scales)
    found = swells(level, ringing(level, (0.0, 0.0)), [o.at_s for o in sharp])
    return [Onset(s.at_s, 0.0, len(scales) - 1, s.full_s - s.at_s) for s in found]


def quiet_before(blows: Sequence[Blow], duration_s: float) -> tuple[float, float]:
    """What lies before the first blow."""
    return (0.0, max(blows[0].onset.at_s - _GUARD_S, 0.0)) if blows else (0.0, duration_s)


def without_rattle(
    blows: Sequence[Blow], samples: Real, rate_hz: float, full_scale: float | None
) -> list[Blow]:
    """Blows less those that only seem to be some because what rings then is clipped."""
    kept: list[Blow] = []
    clipped_until_s = -np.inf
    for blow in blows:
        at_s = blow.onset.at_s
        if kept and at_s < clipped_until_s + _RATTLE_S:
            kept[-1] = replace(kept[-1], limit_s=blow.limit_s, last=blow.last)
        else:
            kept.append(blow)
        stretch = samples[int(at_s * rate_hz) : int(blow.limit_s * rate_hz)]
        rails = clipped_at(stretch, full_scale)
        if len(rails):
            clipped_until_s = at_s + float(rails[-1]) / rate_hz
    return kept


def longest_quiet(
    blows: Sequence[Blow], picture: Ringing, before_s: tuple[float, float]
) -> tuple[float, float]:
    """The longest stretch after a full decay, where that is longer than what lies before."""
    gaps = [before_s]
    for blow in blows:
        ended_s = picture.end_s(blow.onset.at_s, blow.limit_s) + _MORE_S
        gaps.append((ended_s, blow.limit_s - (0.0 if blow.last else _GUARD_S)))
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
    scales: Sequence[Level],
    picture: Ringing,
    full_scale: float | None,
) -> Tap:
    """One blow as a tap: its free decay, and what speaks against it."""
    at_s = blow.onset.at_s
    weak = [x for x in blow.later if x.share < _DOUBLE_SHARE]
    begin_s = at_s + (weak[-1].after_s if weak else 0.0)
    start_s = begin_s + contact_s(blow, begin_s, scales)
    limit_s = blow.limit_s - (0.0 if blow.last else _GUARD_S / 2)
    end_s = max(picture.end_s(start_s, limit_s) + _MORE_S, start_s + _LEAST_RECORD_S)
    end_s = max(min(end_s, limit_s), start_s)
    near = samples[max(int((at_s - _GUARD_S) * rate_hz), 0) : int(end_s * rate_hz) + 1]
    reasons = [
        *(clip_reason(near, full_scale) or double_reason(blow)),
        *short_reason(blow, picture, start_s, end_s),
        *weak_reason(picture, start_s, end_s),
    ]
    start = min(int(np.ceil(start_s * rate_hz)), len(samples))
    end = max(min(int(end_s * rate_hz), len(samples)), start)
    peak = float(np.abs(near).max(initial=0.0))
    return Tap(at_s, start, end, peak, not reasons, tuple(reasons))


def contact_s(blow: Blow, begin_s: float, scales: Sequence[Level]) -> float:
    """Time from the onset to the start of the free decay."""
    if blow.onset.rise_s > 0:
        return blow.onset.rise_s
    finest = contact_end_s(scales[0], begin_s, blow.limit_s)
    coarse = 8 / scales[blow.onset.scale].rate_hz if blow.onset.scale > 0 else 0.0
    return max(finest, coarse)


def clip_reason(near: Real, full_scale: float | None) -> list[str]:
    """Clipped?"""
    count = len(clipped_at(near, full_scale))
    if not count:
        return []
    peak = float(np.abs(near).max())
    at_scale = full_scale is not None and peak >= 0.999 * full_scale
    rail = "full scale" if at_scale else f"a rail of {peak:.3g}"
    return [f"clipped: {count} samples at {rail}; lower the input gain or hit softer"]


def double_reason(blow: Blow) -> list[str]:
    """Struck twice?"""
    strong = [x for x in blow.later if x.share >= _DOUBLE_SHARE]
    if not strong:
        return []
    return [
        f"struck twice: a second blow {1000 * strong[0].after_s:.0f} ms after the first; "
        "let the hammer rebound freely, or use a lighter one"
    ]


def short_reason(blow: Blow, picture: Ringing, start_s: float, end_s: float) -> list[str]:
    """Cut short by the end of the recording, or overlapped by the next blow?"""
    length_s = end_s - start_s
    rings = picture.last(start_s, end_s) > _STILL_RINGS
    enough_db = _ENOUGH_DROP_DB if blow.last else _ENOUGH_OVERLAPPED_DB
    enough_s = _ENOUGH_S if blow.last else _ENOUGH_OVERLAPPED_S
    too_little = length_s < enough_s and picture.drop_db(start_s, end_s) < enough_db
    if length_s >= _SHORTEST_RECORD_S and not (rings and too_little):
        return []
    if blow.last:
        return [
            f"cut short: the recording ends {length_s:.2f} s after the blow, while it still rings; "
            "record until it has died away"
        ]
    return [
        f"overlapped: the next blow comes {length_s:.2f} s later, while it still rings; "
        "wait between blows until it has died away"
    ]


def weak_reason(picture: Ringing, start_s: float, end_s: float) -> list[str]:
    """Too weak?"""
    over = picture.strongest(start_s, min(start_s + 1.0, end_s))
    if over >= RINGS:
        return []
    return [
        f"too weak: {10 * np.log10(max(over, 1e-3)):.0f} dB over the background at best; "
        "hit harder, move the sensor nearer, or stop what makes the noise"
    ]
