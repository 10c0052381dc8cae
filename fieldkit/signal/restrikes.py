"""Second blows while the first still rings: every line changes its amplitude at once.

Short stretches of free decay lie in a subspace that all blows share. One that is struck in its
middle lies in it left and right of the blow, but not as a whole: what the two halves hold more than
the whole is the matched-subspace statistic (Scharf & Friedlander 1994, IEEE Trans. Signal Process.
42, 2146), compared with what neither explains, and with the same moment after the other blows.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.filtering import median, medians
from fieldkit.signal.innovation import Level

Real = NDArray[np.float64]
Indices = NDArray[np.intp]

LONGEST_GAP_S = 0.31
_HALF = 29
_HOLE = 6
"""Samples over which a contact is smeared when the rate is lowered."""
_AHEAD = _HALF + _HOLE
_LENGTH = 2 * _HALF + _HOLE
_LEFTS = (29, 16, 8)
"""Samples before a second blow: the fewer, the sooner after the first it may come."""
_LEAST_RATE_HZ = 200.0
_FINE_HZ = 1500.0
"""Above it every other sample will do: a blow shows over several."""
_LOOK_S = 0.45
_LOOK = 3 * _LENGTH
_MOST_ROWS = 1500
_MOST_DIMENSIONS = 28
_OVER_NOISE = 4.0
_KEEP = 0.9
_LEAST_POWER = 1e-3
_SAME_PLANE = 1e-3
_OTHER_PLANE = 0.05
_LEAST_SHARE = 0.12
_OVER_REST = 7.0
_OVER_USUAL = 3.0
_OVER_OTHERS = 2.0
_SUDDEN = 0.1


@dataclass(frozen=True)
class Stretch:
    """Where one blow rings alone."""

    onset_s: float
    begin_s: float
    """When its contact is over."""
    until_s: float


@dataclass(frozen=True)
class Restrike:
    """A sudden change of all lines after a blow, as one level shows it."""

    after_s: float
    share: float
    """Of the first one's strength, roughly."""
    rate_hz: float
    left: int
    """Samples before it that were looked at."""
    struck: float
    """The statistic at the first blow."""


@dataclass(frozen=True)
class Trace:
    """The statistic after one blow, from sample to sample."""

    after_s: Real
    over_rest: Real
    share: Real
    struck: float
    """Energy that only the blow itself explains."""


@dataclass(frozen=True)
class Planes:
    """Subspaces of a stretch that is struck after so many samples."""

    left: int
    halves: Real
    """(m, a) all that two free decays can be, one on each side."""
    change: Real
    """(m, c) what of it no single decay can be."""

    @property
    def freedom(self) -> int:
        """Dimensions that neither holds."""
        return max(int(self.halves.shape[0] - self.halves.shape[1]), 1)


def restrikes(levels: Sequence[Level], blows: Sequence[Stretch]) -> list[list[Restrike]]:
    """For each blow what every level, and every length before the second blow, shows.

    Levels too fine for the contact of the first one see but its two ends: they are not asked.
    """
    found: list[list[Restrike]] = [[] for _ in blows]
    struck: list[dict[int, float]] = [{} for _ in blows]
    for level in levels:
        decays = free_decays(level, blows) if level.rate_hz > _LEAST_RATE_HZ else None
        if decays is None:
            continue
        for planes in (planes_of(decays, left) for left in _LEFTS):
            traces = traces_of(level, planes, blows)
            for k, one in enumerate(traces):
                others = [t for t in traces[:k] + traces[k + 1 :] if len(t.after_s)]
                struck[k][planes.left] = max(struck[k].get(planes.left, 0.0), one.struck)
                found[k] += outstanding(one, others, planes, level.rate_hz)
    return [
        [one for one in shown if one.struck > _SUDDEN * highest[one.left]]
        for shown, highest in zip(found, struck, strict=True)
    ]


def free_decays(level: Level, blows: Sequence[Stretch]) -> Real | None:
    """(length, d) orthonormal directions that short stretches of free decay take.

    Stretches that fit worst, as those with a second blow in them, are left out.
    """
    rate = level.rate_hz
    look_s = max(_LOOK_S, _LOOK / rate)
    parts = [
        level.samples[
            int(b.begin_s * rate) + _HOLE : int(min(b.onset_s + look_s, b.until_s) * rate)
        ]
        for b in blows
    ]
    parts = [part for part in parts if len(part) > _LENGTH]
    stride = max(sum(len(part) - _LENGTH for part in parts) // _MOST_ROWS, 1)
    rows = [weighed(part, stride) for part in parts]
    data = np.concatenate(rows) if rows else np.zeros((0, _LENGTH))
    if len(data) < _LENGTH or not np.any(data):
        return None
    products = data.T @ data
    first = strongest_directions(products)
    rest = squares(data) - squares(data @ first)
    bad = data[rest > np.quantile(rest, _KEEP)]
    return strongest_directions(products - bad.T @ bad)


def weighed(part: Real, stride: int) -> Real:
    """(r, length) stretches of one decay, the weak ones raised by half of what they are weaker."""
    rows = np.lib.stride_tricks.sliding_window_view(part, _LENGTH)[::stride]
    power = squares(rows)
    top = float(power.max())
    if top <= 0:
        return np.zeros((0, _LENGTH))
    return np.asarray(
        rows / (np.sqrt(top) * np.sqrt(np.maximum(power, _LEAST_POWER * top)))[:, None] ** 0.5
    )


def strongest_directions(products: Real) -> Real:
    """(n, d) eigenvectors that stand out of the noise."""
    values, vectors = np.linalg.eigh(products)
    noise = float(np.median(values[: _LENGTH // 2]))
    count = int(np.count_nonzero(values > _OVER_NOISE * max(noise, 0.0)))
    return np.asarray(vectors[:, ::-1][:, : min(max(count, 2), _MOST_DIMENSIONS)])


def planes_of(decays: Real, left: int) -> Planes:
    """The subspaces of free decay with and without a blow after so many samples."""
    before, after = decays[_HALF - left : _HALF], decays[_HALF + _HOLE :]
    one, two = spanned(before, _SAME_PLANE), spanned(after, _SAME_PLANE)
    whole = spanned(np.vstack([before, after]), _SAME_PLANE)
    halves = np.zeros((left + _HALF, one.shape[1] + two.shape[1]))
    halves[:left, : one.shape[1]] = one
    halves[left:, one.shape[1] :] = two
    return Planes(left, halves, spanned(halves - whole @ (whole.T @ halves), _OTHER_PLANE))


def spanned(vectors: Real, least: float) -> Real:
    """Orthonormal basis of what some vectors span, without directions they hardly take."""
    basis, sizes, _ = np.linalg.svd(vectors, full_matrices=False)
    return np.asarray(basis[:, sizes > least])


def traces_of(level: Level, planes: Planes, blows: Sequence[Stretch]) -> list[Trace]:
    """The statistic after each blow, from the end of its contact on, over that at the blow."""
    places = [
        *(after_contact(level, planes, blow) for blow in blows),
        *(about_onset(level, planes, blow) for blow in blows),
    ]
    change, rest = change_and_rest(level.samples, planes, np.concatenate(places))
    ends = np.cumsum([len(p) for p in places])[:-1]
    changes, rests = np.split(change, ends), np.split(rest, ends)
    dimensions = max(planes.change.shape[1], 1)
    least = 1e-14 * float(np.mean(level.samples**2)) + 1e-300
    out = []
    for k, blow in enumerate(blows):
        struck = float(changes[len(blows) + k].max(initial=0.0))
        share = np.sqrt(changes[k] / struck) if struck > 0 else np.ones(len(places[k]))
        over_rest = changes[k] / dimensions / np.maximum(rests[k], least)
        after_s = places[k] / level.rate_hz - blow.onset_s
        out.append(Trace(after_s, over_rest, share, struck))
    return out


def after_contact(level: Level, planes: Planes, blow: Stretch) -> Indices:
    """Samples at which a second blow is looked for; none where there are hardly any."""
    rate = level.rate_hz
    first = round(blow.begin_s * rate) + planes.left + _HOLE + _HOLE // 2
    past = min(round((blow.onset_s + LONGEST_GAP_S) * rate), round(blow.until_s * rate) - _AHEAD)
    at = np.arange(first, min(past, len(level.samples) - _AHEAD), 2 if rate > _FINE_HZ else 1)
    return at if len(at) >= 3 else at[:0]


def about_onset(level: Level, planes: Planes, blow: Stretch) -> Indices:
    """Samples about the blow itself."""
    onset = round(blow.onset_s * level.rate_hz)
    first = max(onset - 2 * _HOLE, planes.left + _HOLE)
    return np.arange(first, min(onset + 2 * _HOLE, len(level.samples) - _AHEAD))


def change_and_rest(samples: Real, planes: Planes, at: Indices) -> tuple[Real, Real]:
    """(n,) energy that only a blow at each sample explains, and what is left per dimension."""
    view = np.lib.stride_tricks.sliding_window_view
    first = at - _HOLE // 2
    left = view(samples, planes.left)[first - planes.left]
    both = np.hstack([left, view(samples, _HALF)[first + _HOLE]])
    change, held = squares(both @ planes.change), squares(both @ planes.halves)
    return change, np.maximum(squares(both) - held, 0.0) / planes.freedom


def squares(rows: Real) -> Real:
    """(n,) sum of squares of each row."""
    return np.asarray(np.einsum("ij,ij->i", rows, rows))


def outstanding(
    one: Trace, others: Sequence[Trace], planes: Planes, rate_hz: float
) -> list[Restrike]:
    """The highest of a trace where it stands out of itself, of the rest and of the other blows."""
    if not len(one.after_s):
        return []
    needed = _OVER_REST * (1 + 3 / np.sqrt(planes.freedom))
    usual = max(median(one.over_rest), 1.0)
    clear = (one.over_rest > max(needed, _OVER_USUAL * usual)) & (one.share > _LEAST_SHARE)
    at = np.flatnonzero(clear)
    if others and len(at):
        elsewhere = [np.interp(one.after_s[at], t.after_s, t.share) for t in others]
        clear[at] = one.share[at] > _OVER_OTHERS * medians(np.array(elsewhere).T)
    if not np.any(clear):
        return []
    top = int(np.argmax(np.where(clear, one.over_rest, 0.0)))
    after_s, share = float(one.after_s[top]), float(one.share[top])
    return [Restrike(after_s, share, rate_hz, planes.left, one.struck)]
