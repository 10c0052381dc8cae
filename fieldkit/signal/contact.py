"""What happens within a blow: when the contact ends, and whether a second blow follows.

A short linear predictor fitted to the ringing foresees free decay down to the noise. Run backwards
it fails up to the end of the contact and not after it; run forwards it fails from the moment of a
second blow on.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.innovation import Level
from fieldkit.signal.prediction import SHARP, SHORTEST_GAP_S, Errors, Predictor
from fieldkit.signal.restrikes import LONGEST_GAP_S, Restrike

Real = NDArray[np.float64]

_SHARP_ENOUGH = 30.0
_OVER_TYPICAL = 6.5
_OVER_FORCE = 0.03
_FOOT = 0.1
_SAME_S = 0.012
_CHANGES = 3
_LIKE = 2.0
_CLEAR = 20.0
_CLEAR_SOON = 13.0
_SOON_S = 0.03
_CLEAR_AMID = 10.0
_OVER_STRONGEST = 0.05
"""As the energy asked of an onset, in amplitude."""
_LEAST_AMID = 0.1
"""Of the error at the strongest blow."""
_OVER_PRECEDING = 2.5
_LEAST_SHARE = 0.12
_LONGEST_CONTACT_S = 0.015
"""Until then a change of all lines may be the end of the contact."""
_QUIET_AFTER_S = 0.1


@dataclass(frozen=True)
class Place:
    """A sudden failure of prediction."""

    at_s: float
    sharpness: float
    """Error over its typical size nearby."""
    rate_hz: float
    """Of the finest level that shows it."""


@dataclass(frozen=True)
class Later:
    """A blow that follows while the first still rings."""

    after_s: float
    """Time after the first."""
    share: float
    """Of the first one's strength, roughly."""
    sharpness: float
    """Error over its typical size; 0 where no prediction failed but all lines changed."""
    shown_by: tuple[float, int]
    """Rate of the level, and samples looked at before it (0 for a prediction)."""


def sharpest(scales: Sequence[Errors], about_s: float, slack_s: float) -> Place | None:
    """Where, within a slack of a supposed blow, prediction fails most; None where nowhere.

    All levels are asked: the finest shows hard blows in quiet, the others soft ones and those in
    noise. The time is that of the finest level that shows it.
    """
    best: Place | None = None
    for errors in scales:
        place = first_failure(errors, about_s, slack_s)
        if place is not None and (best is None or place.sharpness > best.sharpness):
            best = place if best is None else replace(best, sharpness=place.sharpness)
        if best is not None and best.sharpness > _SHARP_ENOUGH:
            break
    return best


def first_failure(errors: Errors, about_s: float, slack_s: float) -> Place | None:
    """Where the error first nears its peak, within a slack of the time asked about."""
    slack_s += 4 / errors.rate_hz
    near = errors.between(about_s - slack_s, about_s + slack_s + SHORTEST_GAP_S)
    size = errors.size[near]
    peak = float(size.max(initial=0.0))
    if peak < SHARP or errors.raw[near].max() < _OVER_STRONGEST * errors.strongest:
        return None
    first = int(np.argmax(size > max(_OVER_TYPICAL, _FOOT * peak)))
    return Place((near.start + first) / errors.rate_hz, peak, errors.rate_hz)


def overlooked(
    scales: Sequence[Errors], rings: Callable[[float], bool], known_s: Sequence[float]
) -> list[tuple[float, int]]:
    """Times of blows amid loud ringing that no comparison with the whole recording shows.

    Two levels show them, or one clearly; each comes with the index of the level. ``rings`` tells
    whether it rings loudly at a time.
    """
    found: list[tuple[float, int]] = []
    shown = sorted(
        (float(i / errors.rate_hz), k) for k, errors in enumerate(scales) for i in errors.sharp
    )
    for at_s, k in shown:
        errors = scales[k]
        if not rings(at_s) or not far_from(
            at_s, [*known_s, *(f for f, _ in found)], errors.smeared_s
        ):
            continue
        at = round(at_s * errors.rate_hz)
        if errors.raw[at] < _LEAST_AMID * errors.highest_at(known_s):
            continue
        near_s = 6 / errors.rate_hz
        agree = any(abs(at_s - other_s) < near_s for other_s, j in shown if j != k)
        if agree or errors.size[at] > _CLEAR_AMID:
            found.append((at_s, k))
    return found


def far_from(at_s: float, known_s: Sequence[float], smeared_s: float) -> bool:
    """True where no known blow is so near that this is part of it."""
    gap_s = max(LONGEST_GAP_S, smeared_s)
    return all(not -0.05 < at_s - known < gap_s for known in known_s)


def contact_end_s(
    level: Level, predictor: Predictor | None, onset_s: float, until_s: float
) -> float:
    """How long after the onset the force acts, by the finest level."""
    if predictor is None:
        return 2 / level.rate_hz
    first = max(int((onset_s - 0.002) * level.rate_hz), 0)
    reach_s = min(onset_s + _LONGEST_CONTACT_S + _QUIET_AFTER_S, until_s)
    last = min(int(reach_s * level.rate_hz) + predictor.order, len(level.samples))
    raw = predictor.errors(level.samples[first:last][::-1])[::-1]
    time_s = (first + np.arange(len(raw))) / level.rate_hz - onset_s
    usual = float(np.median(raw[: max(len(raw) - predictor.order, 1)])) if len(raw) else 0.0
    size = np.where(time_s < _LONGEST_CONTACT_S, raw, 0.0) / max(usual, 1e-280)
    acting = np.flatnonzero(size > max(_OVER_TYPICAL, _OVER_FORCE * float(size.max(initial=0.0))))
    last_s = float(time_s[acting[-1]]) if len(acting) else 0.0
    return max(last_s, 0.0) + 2 / level.rate_hz


def later_blows(
    scales: Sequence[Errors], onset_s: float, until_s: float, changes: Sequence[Restrike]
) -> list[Later]:
    """Second blows in order of time, by failures of prediction and changes of all lines."""
    sudden = [one for errors in scales for one in jumps(errors, onset_s, until_s)]
    changed = [Later(c.after_s, c.share, 0.0, (c.rate_hz, c.left)) for c in changes]
    shown = sorted([*sudden, *changed], key=lambda one: one.after_s)
    groups: list[list[Later]] = []
    for one in shown:
        if groups and one.after_s - groups[-1][-1].after_s < _SAME_S:
            groups[-1].append(one)
        else:
            groups.append([one])
    return [
        max(group, key=lambda one: (one.sharpness > 0, one.share))
        for group in groups
        if sure(group)
    ]


def sure(seen: Sequence[Later]) -> bool:
    """True for what two levels show, or one clearly; soon after the first few levels can tell.

    Changes of all lines alone must be of like strength at several levels. Soon after the first
    they are its contact that ends.
    """
    soon = seen[0].after_s < _SOON_S
    if max(one.sharpness for one in seen) > (_CLEAR_SOON if soon else _CLEAR):
        return True
    sudden = {one.shown_by for one in seen if one.sharpness > 0}
    changes = [one for one in seen if one.sharpness == 0]
    if len(sudden) > 1 or (sudden and changes):
        return True
    return seen[0].after_s > _LONGEST_CONTACT_S and alike(changes)


def alike(changes: Sequence[Later]) -> bool:
    """True for changes of like strength at three levels, or twice at each of two."""
    if len(changes) < _CHANGES:
        return False
    middle = float(np.median([one.share for one in changes]))
    rates = [one.shown_by[0] for one in changes if 1 / _LIKE < one.share / middle < _LIKE]
    twice = [rate for rate in set(rates) if rates.count(rate) > 1]
    return len(set(rates)) > 2 or len(twice) > 1


def early_change_s(changes: Sequence[Restrike]) -> float:
    """When all lines last change soon after the blow, at two levels; 0 if they do not.

    The free decay begins after it, whether it was a long contact that ended or a rebound.
    """
    soon = [c for c in changes if c.after_s < _SOON_S]
    enough = len(soon) >= _CHANGES and len({c.rate_hz for c in soon}) > 1
    return max(c.after_s for c in soon) if enough else 0.0


def jumps(errors: Errors, onset_s: float, until_s: float) -> list[Later]:
    """Sudden rises of the forward error after the first blow, each against the first."""
    near = max(int(0.0015 * errors.rate_hz), 1)
    wide = max(int(0.006 * errors.rate_hz), 3)
    stretch = errors.between(
        onset_s - errors.smeared_s, min(onset_s + LONGEST_GAP_S, until_s - 0.01) + 0.006
    )
    size, raw = errors.size[stretch], errors.raw[stretch]
    time_s = (stretch.start + np.arange(len(size))) / errors.rate_hz - onset_s
    first = float(raw[np.abs(time_s) < errors.smeared_s].max(initial=0.0))
    found: list[Later] = []
    for i in np.flatnonzero(
        (size > SHARP) & (raw > _LEAST_SHARE * first) & (time_s > errors.smeared_s)
    ):
        preceding = float(raw[max(i - near - wide, 0) : max(i - near, 1)].max())
        if raw[i] > _OVER_PRECEDING * preceding:
            top = i + int(np.argmax(raw[i : i + wide + 1]))
            if found and time_s[top] - found[-1].after_s < 0.01:
                continue
            share = float(raw[top]) / max(first, 1e-300)
            found.append(Later(float(time_s[top]), share, float(size[top]), (errors.rate_hz, 0)))
    return found
