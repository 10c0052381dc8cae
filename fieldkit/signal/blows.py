"""Blows of a recording: confirmed, doubles gathered, what clipped ringing feigns left out."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.clipping import clipped_at
from fieldkit.signal.contact import (
    LONGEST_GAP_S,
    Later,
    contact_end_s,
    later_blows,
    overlooked,
    sharpest,
)
from fieldkit.signal.innovation import Level
from fieldkit.signal.onsets import Onset, onsets
from fieldkit.signal.ringing import Ringing, ringing
from fieldkit.signal.swells import swells

Real = NDArray[np.float64]

DOUBLE_SHARE = 0.15
GUARD_S = 0.03
_RATTLE_S = 0.2
"""Clipped ringing goes on for as long after the last sample at the rail."""
_EDGE_S = 0.05
_LOUD = 100.0
"""Power over the background's in ringing that may hide a blow."""


@dataclass(frozen=True)
class Blow:
    """A blow with everything that strikes while it still rings."""

    onset: Onset
    later: tuple[Later, ...]
    limit_s: float
    """Where the next blow begins or the recording ends."""
    last: bool
    """True where the recording's end is the limit."""
    rails: int = 0
    """Samples that stand at a rail."""
    rail: float = 0.0
    """Where that is."""


def find_blows(scales: Sequence[Level]) -> list[Blow]:
    """All blows in order of time: sudden ones, soft ones, and those amid loud ringing."""
    level = spectral_level(scales)
    picture = ringing(level, (0.0, 0.0))
    sharp = confirmed(onsets(scales), scales)
    soft = [
        Onset(s.at_s, 0.0, len(scales) - 1, s.full_s - s.at_s)
        for s in swells(level, picture, [o.at_s for o in sharp])
    ]
    known = [*sharp, *soft]
    for scale, coarse in enumerate(scales):
        if coarse.rate_hz <= level.rate_hz and (coarse.rate_hz > 100 or scale == 0):
            amid = overlooked(coarse, loud_moments(picture), [o.at_s for o in known])
            known += confirmed([Onset(at_s, 0.0, scale) for at_s in amid], scales)
    known.sort(key=lambda o: o.at_s)
    return grouped(known, scales, len(scales[0].samples) / scales[0].rate_hz)


def spectral_level(scales: Sequence[Level]) -> Level:
    """The coarsest level whose band still holds what rings up to some hundred hertz."""
    return [s for s in scales if s is scales[0] or s.rate_hz >= 800][-1]


def loud_moments(picture: Ringing) -> Real:
    """(f,) centres of the frames that ring loudly."""
    return picture.time_s[picture.over > _LOUD]


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
        Blow(o, later_than(o, scales, limit), limit, o is firsts[-1])
        for o, limit in zip(firsts, limits, strict=True)
    ]


def later_than(first: Onset, scales: Sequence[Level], limit_s: float) -> tuple[Later, ...]:
    """Second blows; none can be told after a soft first one."""
    return () if first.rise_s > 0 else tuple(later_blows(scales, first.at_s, limit_s))


def without_rattle(
    blows: Sequence[Blow], samples: Real, rate_hz: float, full_scale: float | None
) -> list[Blow]:
    """Blows less those that only seem to be some because what rings then is clipped."""
    kept: list[Blow] = []
    clipped_until_s = -np.inf
    for blow in blows:
        at_s = blow.onset.at_s
        first = max(int((at_s - GUARD_S) * rate_hz), 0)
        stretch = samples[first : int(blow.limit_s * rate_hz)]
        where = clipped_at(stretch, full_scale)
        if kept and at_s < clipped_until_s + _RATTLE_S:
            kept[-1] = replace(kept[-1], limit_s=blow.limit_s, last=blow.last)
        else:
            rail = float(np.abs(stretch).max(initial=0.0))
            kept.append(replace(blow, rails=len(where), rail=rail))
        if len(where):
            clipped_until_s = (first + float(where[-1])) / rate_hz
    return kept


def contact_s(blow: Blow, begin_s: float, scales: Sequence[Level]) -> float:
    """Time from the onset to the start of the free decay."""
    if blow.onset.rise_s > 0:
        return blow.onset.rise_s
    finest = contact_end_s(scales[0], begin_s, blow.limit_s)
    coarse = 8 / scales[blow.onset.scale].rate_hz if blow.onset.scale > 0 else 0.0
    return max(finest, coarse)
