"""What happens within a blow: when the contact ends, and whether a second blow follows.

A short linear predictor fitted to the ringing after the blow foresees free decay down to the noise.
Run backwards it fails up to the end of the contact and not after it; run forwards it fails from the
moment of a second blow on.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.innovation import Level
from fieldkit.signal.prediction import ORDERS, SHORTEST_GAP_S, Errors, prediction_errors

Real = NDArray[np.float64]

SHARP = 8.0
"""Error over its typical size: above it at a blow, below 7 where there is none."""
LONGEST_GAP_S = 0.31
_SHARP_ENOUGH = 30.0
_OVER_TYPICAL = 6.5
_OVER_FORCE = 0.03
_FOOT = 0.1
_STRIDE_S = 0.25
_SAME_S = 0.015
_CLEAR = 20.0
_CLEAR_SOON = 13.0
_SOON_S = 0.03
_OVER_PRECEDING = 2.5
_LEAST_SHARE = 0.12
_LONGEST_CONTACT_S = 0.015


@dataclass(frozen=True)
class Place:
    """A sudden failure of prediction."""

    at_s: float
    sharpness: float
    """Error over its typical size nearby."""


@dataclass(frozen=True)
class Later:
    """A blow that follows while the first still rings."""

    after_s: float
    """Time after the first."""
    share: float
    """Of the first one's strength, roughly."""
    sharpness: float
    """Error over its typical size."""


def sharpest(levels: Sequence[Level], about_s: float, slack_s: float) -> Place | None:
    """Where, within a slack of a supposed blow, prediction fails most; None where nowhere.

    All levels are asked: the finest shows hard blows in quiet, the others soft ones and those in
    noise. The time is that of the finest level that shows it.
    """
    best: Place | None = None
    for level in levels:
        errors = prediction_errors(level, about_s, np.inf, slack_s=slack_s)
        place = first_failure(errors, about_s, slack_s) if errors is not None else None
        if place is not None and (best is None or place.sharpness > best.sharpness):
            at_s = best.at_s if best is not None else place.at_s
            best = Place(at_s, place.sharpness)
        if best is not None and best.sharpness > _SHARP_ENOUGH:
            break
    return best


def first_failure(errors: Errors, about_s: float, slack_s: float) -> Place | None:
    """Where the error first nears its peak, within a slack of the time asked about."""
    slack_s += 4 / errors.rate_hz
    near = (errors.time_s > -slack_s) & (errors.time_s < slack_s + SHORTEST_GAP_S)
    size = np.where(near, errors.size, 0.0)
    peak = float(size.max(initial=0.0))
    if peak < SHARP:
        return None
    first = int(np.argmax(size > max(_OVER_TYPICAL, _FOOT * peak)))
    return Place(about_s + float(errors.time_s[first]), peak)


def overlooked(level: Level, ringing_s: Real, known_s: Sequence[float]) -> list[float]:
    """Times of blows amid loud ringing that no comparison with the whole recording shows.

    ``ringing_s`` (f,) are the moments that ring. Every quarter of a second is compared with a
    predictor fitted to it alone.
    """
    found: list[float] = []
    for about_s in np.arange(0.0, len(level.samples) / level.rate_hz, _STRIDE_S):
        if not np.any(np.abs(ringing_s - about_s) < _STRIDE_S):
            continue
        errors = prediction_errors(level, float(about_s), np.inf, orders=ORDERS[-1:])
        if errors is None:
            continue
        inside = (errors.time_s > 0) & (errors.time_s <= _STRIDE_S)
        first = int(np.argmax(inside & (errors.size > SHARP)))
        at_s = float(about_s + errors.time_s[first])
        if inside[first] and errors.size[first] > SHARP and far_from(at_s, [*known_s, *found]):
            found.append(at_s)
    return found


def far_from(at_s: float, known_s: Sequence[float]) -> bool:
    """True where no known blow is so near that this is part of it."""
    return all(not -0.05 < at_s - known < LONGEST_GAP_S for known in known_s)


def contact_end_s(level: Level, onset_s: float, until_s: float) -> float:
    """How long after the onset the force acts, by the finest level."""
    errors = prediction_errors(level, onset_s, until_s, backwards=True)
    if errors is None:
        return 2 / level.rate_hz
    within = (errors.time_s > -0.002) & (errors.time_s < _LONGEST_CONTACT_S)
    size = np.where(within, errors.size, 0.0)
    acting = np.flatnonzero(size > max(_OVER_TYPICAL, _OVER_FORCE * float(size.max(initial=0.0))))
    last_s = float(errors.time_s[acting[-1]]) if len(acting) else 0.0
    return max(last_s, 0.0) + 2 / level.rate_hz


def later_blows(levels: Sequence[Level], onset_s: float, until_s: float) -> list[Later]:
    """Second blows in order of time: what two levels show, or one clearly."""
    tried = [prediction_errors(level, onset_s, until_s) for level in levels]
    shown = sorted(
        (one for errors in tried if errors is not None for one in jumps(errors)),
        key=lambda one: one.after_s,
    )
    groups: list[list[Later]] = []
    for one in shown:
        if groups and one.after_s - groups[-1][-1].after_s < _SAME_S:
            groups[-1].append(one)
        else:
            groups.append([one])
    return [max(group, key=lambda one: one.share) for group in groups if sure(group)]


def sure(seen: Sequence[Later]) -> bool:
    """True for what two levels show, or one clearly; soon after the first few levels can tell."""
    needed = _CLEAR_SOON if seen[0].after_s < _SOON_S else _CLEAR
    return len(seen) > 1 or seen[0].sharpness > needed


def jumps(errors: Errors) -> list[Later]:
    """Sudden rises of the forward error after the first blow, each against the first."""
    first = errors.first
    near = max(int(0.0015 * errors.rate_hz), 1)
    wide = max(int(0.006 * errors.rate_hz), 3)
    ahead = np.lib.stride_tricks.sliding_window_view(np.pad(errors.size, (0, wide)), wide + 1)
    peak = ahead.max(axis=1)
    loud = peak > max(SHARP, _LEAST_SHARE * first)
    inside = (errors.time_s > errors.smeared_s) & (errors.time_s < LONGEST_GAP_S)
    found: list[Later] = []
    for i in np.flatnonzero(loud & inside):
        preceding = float(errors.size[max(i - near - wide, 0) : max(i - near + 1, 1)].max())
        top = min(int(i) + int(np.argmax(ahead[i])), len(peak) - 1)
        after_s = float(errors.time_s[top])
        if peak[i] > _OVER_PRECEDING * preceding and not (
            found and after_s - found[-1].after_s < 0.01
        ):
            size = float(peak[i])
            found.append(Later(after_s, size / max(first, 1e-300), size))
    return found
