"""What speaks against using a blow, in words for an engineer with what to change."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from fieldkit.signal.blows import DOUBLE_SHARE, Blow
from fieldkit.signal.first_moments import FirstMoments
from fieldkit.signal.ringing import RINGS, Ringing

Missing = tuple[int, int]
"""Frames are missing directly before a sample from the first to the second."""

_SHORTEST_RECORD_S = 0.2
_ENOUGH_DROP_DB = 9.0
_ENOUGH_OVERLAPPED_DB = 4.0
_ENOUGH_S = 3.0
_ENOUGH_OVERLAPPED_S = 1.0
_STILL_RINGS = 3 * RINGS


def objections(
    blow: Blow,
    picture: Ringing,
    firsts: FirstMoments,
    start_s: float,
    end_s: float,
    full_scale: float | None,
) -> list[str]:
    """All reasons not to use the free decay from start to end; empty where it is good."""
    sudden = blow.onset.rise_s == 0
    return [
        *(clip_reason(blow, full_scale) or double_reason(blow)),
        *short_reason(blow, picture, start_s, end_s),
        *weak_reason(picture, firsts if sudden else None, start_s, end_s),
    ]


def clip_reason(blow: Blow, full_scale: float | None) -> list[str]:
    """Clipped?"""
    if not blow.rails:
        return []
    at_scale = full_scale is not None and blow.rail >= 0.999 * full_scale
    rail = "full scale" if at_scale else f"a rail of {blow.rail:.3g}"
    return [f"clipped: {blow.rails} samples at {rail}; lower the input gain or hit softer"]


def double_reason(blow: Blow) -> list[str]:
    """Struck twice?"""
    strong = [x for x in blow.later if x.share >= DOUBLE_SHARE]
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


def weak_reason(
    picture: Ringing, firsts: FirstMoments | None, start_s: float, end_s: float
) -> list[str]:
    """Too weak? The first moments tell nothing of a soft blow, whose contact may go on."""
    over = picture.strongest(start_s, min(start_s + 1.0, end_s))
    if over < RINGS and firsts:
        over = max(over, firsts.over(start_s, end_s))
    if over >= RINGS:
        return []
    height = (
        f"{10 * np.log10(over):.0f} dB over the background at best"
        if over > 1
        else ("nothing rings above the background after it")
    )
    return [f"too weak: {height}; hit harder, move the sensor nearer, or stop what makes the noise"]


def gap_reason(first: int, end: int, gaps: Sequence[Missing], rate_hz: float) -> list[str]:
    """Are frames missing between the samples first and end?"""
    inside = [gap for gap in gaps if gap[1] > first and gap[0] < end]
    if not inside:
        return []
    return [
        f"frames are missing inside it, at {inside[0][1] / rate_hz:.2f} s: the decay is not whole; "
        "tap again"
    ]
