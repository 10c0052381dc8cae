"""Blows of a recording: confirmed, doubles gathered, what clipped ringing feigns left out."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.bursts import is_burst
from fieldkit.signal.contact import (
    Later,
    contact_end_s,
    early_change_s,
    later_blows,
    overlooked,
    sharpest,
)
from fieldkit.signal.innovation import Level
from fieldkit.signal.onsets import Onset, onsets
from fieldkit.signal.prediction import Errors, Predictor, backward_predictor, errors_of
from fieldkit.signal.rails import blow_clipped_at
from fieldkit.signal.restrikes import LONGEST_GAP_S, Restrike, Stretch, restrikes
from fieldkit.signal.ringing import Ringing, ringing
from fieldkit.signal.swells import APART_S, Swell, swells

Real = NDArray[np.float64]

DOUBLE_SHARE = 0.15
GUARD_S = 0.03
SOFT_GUARD_S = 0.15
"""The start of a soft blow is known less well."""
_RATTLE_S = 0.2
"""Clipped ringing goes on for as long after the last sample at the rail."""
_EDGE_S = 0.05
_RINGS_S = 0.25
_SOFT_SLACK_S = 0.12
_LEAST_RATE_HZ = 100.0
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
    contact_s: float = 0.0
    """From the onset, or the last weak rebound, to the start of the free decay."""
    burst: bool = False
    """True where it looks like a burst of noise, as ringing at a rail does too."""
    rails: int = 0
    """Samples that stand at a rail."""
    rail: float = 0.0
    """Where that is."""


def find_blows(scales: Sequence[Level]) -> list[Blow]:
    """All blows in order of time: sudden ones, soft ones, and those amid loud ringing."""
    level = spectral_level(scales)
    picture = ringing(level, (0.0, 0.0))
    supposed = onsets(scales)
    rises = swells(level, picture)
    anchors = sorted([*(o.at_s for o in supposed), *(s.at_s for s in apart(rises, supposed))])
    foresights = [e for e in (errors_of(s, anchors) for s in scales) if e is not None]
    known = confirmed(supposed, foresights, scales)
    soft = [Onset(s.at_s, 0.0, len(scales) - 1, s.full_s - s.at_s) for s in apart(rises, known)]
    known += [made_sudden(onset, foresights, scales) for onset in soft]
    loud = loud_moments(picture)
    slow = [e for e in foresights if _LEAST_RATE_HZ < e.rate_hz <= level.rate_hz] or foresights[:1]
    amid = overlooked(
        slow,
        lambda at_s: bool(np.any(np.abs(loud - at_s) < _RINGS_S)),
        [o.at_s for o in known],
    )
    scale_of = {s.rate_hz: i for i, s in enumerate(scales)}
    supposed_amid = [Onset(at_s, 0.0, scale_of[slow[k].rate_hz]) for at_s, k in amid]
    known += confirmed(supposed_amid, foresights, scales)
    known.sort(key=lambda o: o.at_s)
    back = backward_predictor(scales[0], anchors)
    return grouped(known, foresights, scales, back)


def apart(rises: Sequence[Swell], known: Sequence[Onset]) -> list[Swell]:
    """Rises that belong to none of the onsets."""
    return [s for s in rises if all(abs(s.middle_s - o.at_s) > APART_S for o in known)]


def spectral_level(scales: Sequence[Level]) -> Level:
    """The coarsest level whose band still holds what rings up to some hundred hertz."""
    return [s for s in scales if s is scales[0] or s.rate_hz >= 800][-1]


def loud_moments(picture: Ringing) -> Real:
    """(f,) centres of the frames that ring loudly."""
    return picture.time_s[picture.over > _LOUD]


def confirmed(
    found: Sequence[Onset], foresights: Sequence[Errors], scales: Sequence[Level]
) -> list[Onset]:
    """Onsets at which a predictor fitted nearby fails too, each at its refined time."""
    out: list[Onset] = []
    last_s = len(scales[0].samples) / scales[0].rate_hz - _EDGE_S
    for onset in found:
        slack_s = 4 / scales[onset.scale].rate_hz if onset.scale else 0.004
        place = sharpest(foresights, onset.at_s, slack_s)
        if place is None or place.at_s > last_s:
            continue
        if not (out and place.at_s - out[-1].at_s < slack_s):
            out.append(replace(onset, at_s=place.at_s))
    return out


def made_sudden(soft: Onset, foresights: Sequence[Errors], scales: Sequence[Level]) -> Onset:
    """A soft onset at the moment prediction fails, where it does."""
    place = sharpest(foresights, soft.at_s, _SOFT_SLACK_S)
    if place is None:
        return soft
    scale = [s.rate_hz for s in scales].index(place.rate_hz)
    return Onset(place.at_s, 0.0, scale)


def grouped(
    found: Sequence[Onset],
    foresights: Sequence[Errors],
    scales: Sequence[Level],
    back: Predictor | None,
) -> list[Blow]:
    """Onsets that follow each other within the ringing of a double blow, as one blow."""
    firsts: list[Onset] = []
    for onset in found:
        if not firsts or onset.at_s - firsts[-1].at_s > LONGEST_GAP_S:
            firsts.append(onset)
    duration_s = len(scales[0].samples) / scales[0].rate_hz
    limits = [*(o.at_s for o in firsts[1:]), duration_s][: len(firsts)]
    blows = [Blow(o, (), x, o is firsts[-1]) for o, x in zip(firsts, limits, strict=True)]
    contacts = [contact_s(b, scales, back) for b in blows]
    stretches = [
        Stretch(b.onset.at_s, b.onset.at_s + c, b.limit_s - (0.0 if b.last else GUARD_S))
        for b, c in zip(blows, contacts, strict=True)
    ]
    changes = restrikes(scales, stretches)
    out = []
    for blow, stretch, change in zip(blows, stretches, changes, strict=True):
        later = later_than(blow, foresights, change)
        contact = max(stretch.begin_s - stretch.onset_s, early_change_s(change))
        burst = is_burst(foresights, blow.onset.at_s)
        blow = replace(blow, later=later, contact_s=contact, burst=burst)
        weak = any(x.share < DOUBLE_SHARE for x in later)
        out.append(replace(blow, contact_s=contact_s(blow, scales, back)) if weak else blow)
    return out


def later_than(
    first: Blow, scales: Sequence[Errors], changes: Sequence[Restrike]
) -> tuple[Later, ...]:
    """Second blows; none can be told after a soft first one."""
    if first.onset.rise_s > 0:
        return ()
    return tuple(later_blows(scales, first.onset.at_s, first.limit_s, changes))


def without_rattle(
    blows: Sequence[Blow], samples: Real, rate_hz: float, full_scale: float | None
) -> list[Blow]:
    """Blows less those that only seem to be some: clipped ringing, and bursts of noise."""
    kept: list[Blow] = []
    clipped_until_s = -np.inf
    for blow in blows:
        at_s = blow.onset.at_s
        first = max(int((at_s - GUARD_S) * rate_hz), 0)
        stretch = samples[first : int(blow.limit_s * rate_hz)]
        where = blow_clipped_at(stretch, full_scale)
        if kept and at_s < clipped_until_s + _RATTLE_S:
            kept[-1] = replace(kept[-1], limit_s=blow.limit_s, last=blow.last)
        elif blow.burst and not len(where):
            continue
        else:
            rail = float(np.abs(stretch).max(initial=0.0))
            kept.append(replace(blow, rails=len(where), rail=rail))
        if len(where):
            clipped_until_s = (first + float(where[-1])) / rate_hz
    return kept


def contact_s(blow: Blow, scales: Sequence[Level], back: Predictor | None) -> float:
    """Time from the onset to the start of the free decay."""
    if blow.onset.rise_s > 0:
        return blow.onset.rise_s
    weak = [x.after_s for x in blow.later if x.share < DOUBLE_SHARE]
    begin_s = weak[-1] if weak else 0.0
    finest = contact_end_s(scales[0], back, blow.onset.at_s + begin_s, blow.limit_s)
    coarse = 8 / scales[blow.onset.scale].rate_hz if blow.onset.scale > 0 else 0.0
    return begin_s + max(finest, coarse)
