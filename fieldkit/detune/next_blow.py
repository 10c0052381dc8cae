"""Which further blow would narrow the answer most, before it is struck.

The ensemble stands in for a joint normal distribution of what matters and of what a blow would
measure; observing y with noise R leaves of the variance of t on average
var(t) - cov(t, y) (var(y) + R)^-1 cov(y, t) (Bayes linear update; Raiffa and Schlaifer 1961,
Applied Statistical Decision Theory, on preposterior analysis, from memory). Which modes a blow
shows is not certain: the mean is taken over every set of them, each with its chance.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import product
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.field import AXES
from fieldkit.detune.likelihood import MODEL_ERROR
from fieldkit.detune.visible import Followed
from fieldkit.quantity import show

Array = NDArray[np.float64]

READING_ERROR = 0.001
"""Relative sd of a frequency read from a few good taps (common practice, no source)."""
GRID_STEP = 4
"""Every fourth station of the field is looked at."""
MOST_NEW = 5
"""Modes of one blow that are weighed with their chances to show."""
UNSEEN = 1e6
"""Noise variance of a mode that did not show, in ln of frequency."""
WORTHWHILE = 0.1
"""A blow that cuts the doubt by a smaller share is not worth the walk."""
SETTLED = 0.9


@dataclass(frozen=True)
class Expected:
    """A mode that a blow would show."""

    low_hz: float
    high_hz: float
    direction: str
    chance: float
    """To show."""


@dataclass(frozen=True)
class Blow:
    """A further tap and what it is expected to be worth."""

    at_m: float
    direction: str
    state: str
    sd_before: float
    """Relative doubt of what matters now: one standard deviation of ln frequency."""
    sd_after: float
    """The same, expected after the blow."""
    about: str
    """What matters, in words."""
    modes: tuple[Expected, ...]
    settles: float | None = None
    """Chance that the best change is then known to clear, or not to, with SETTLED."""

    @property
    def gain(self) -> float:
        """Share of the doubt that is expected to go."""
        return 1 - self.sd_after / self.sd_before if self.sd_before > 0 else 0.0


@dataclass(frozen=True)
class Matters:
    """What the answer hangs on, over the ensemble."""

    values: Array
    """(members, k) in ln of frequency."""
    about: str
    clearance: bool = False
    """Whether it is one clearance that is positive where the best change works."""


def next_blows(
    watched: Sequence[tuple[str, Followed]],
    seen: Sequence[tuple[str, int]],
    matters: Matters,
    may_reach: Sequence[bool],
) -> tuple[Blow, ...]:
    """The best station for each direction and state, the most telling first.

    ``watched`` holds the states a blow could be struck in; ``seen`` (state, mode number) what was
    tapped already and is left out; ``may_reach`` says of every station of the field whether a
    sensor can sit there.
    """
    found = [
        blow
        for state, modes in watched
        for axis in AXES
        if (blow := _best(state, modes, axis, seen, matters, may_reach)) is not None
    ]
    return tuple(sorted(found, key=lambda blow: blow.sd_after))


def _best(
    state: str,
    modes: Followed,
    axis: str,
    seen: Sequence[tuple[str, int]],
    matters: Matters,
    may_reach: Sequence[bool],
) -> Blow | None:
    new = [j for j, number in enumerate(modes.number) if (state, number) not in seen]
    stations = [i for i in range(0, len(may_reach), GRID_STEP) if may_reach[i]]
    if not new or not stations:
        return None
    shown = modes.shown(stations, axis)[:, new]
    left = [variance_left(matters.values, np.log(modes.frequency_hz[:, new]), row) for row in shown]
    best = int(np.argmin([float(v.sum()) for v in left]))
    before, after = matters.values.var(axis=0), left[best]
    expected = [
        Expected(*modes.interval(j), modes.direction[j], float(shown[best, i]))
        for i, j in enumerate(new)
        if shown[best, i] >= 0.5
    ]
    return Blow(
        float(modes.field.station_m[stations[best]]),
        axis,
        state,
        _root_mean(before),
        _root_mean(after),
        matters.about,
        tuple(expected),
        settled(float(matters.values.mean()), float(before[0]), float(after[0]))
        if matters.clearance
        else None,
    )


def variance_left(target: Array, seen: Array, chance: Array) -> Array:
    """(k,) expected variance of ``target`` (members, k) after modes ``seen`` (members, n) show.

    ``chance`` (n,) is that of each mode to show.
    """
    target, seen = target - target.mean(axis=0), seen - seen.mean(axis=0)
    cross = target.T @ seen / len(target)
    own = seen.T @ seen / len(seen)
    noise = MODEL_ERROR**2 + READING_ERROR**2
    told = chance * (cross**2).sum(axis=0) / (np.diag(own) + noise)
    kept = np.argsort(-told)[:MOST_NEW]
    cross, own, chance = cross[:, kept], own[np.ix_(kept, kept)], chance[kept]
    sets = np.array(list(product((False, True), repeat=len(kept))))
    weight = np.prod(np.where(sets, chance, 1 - chance), axis=1)
    variance = own + np.where(sets, noise, UNSEEN)[:, :, None] * np.eye(len(kept))
    gained = np.einsum("kn,snm,km->sk", cross, np.linalg.inv(variance), cross)
    return np.asarray(np.maximum(target.var(axis=0) - weight @ gained, 0.0))


def settled(mean: float, before: float, after: float) -> float:
    """Chance that a normal clearance of this mean will be known in sign with SETTLED.

    ``before`` and ``after`` are its variances now and after the measurement.
    """
    normal = NormalDist()
    moves = max(before - after, 0.0) ** 0.5
    needed = normal.inv_cdf(SETTLED) * after**0.5
    if moves < 1e-12:
        return float(abs(mean) >= needed)
    return normal.cdf((mean - needed) / moves) + normal.cdf((-mean - needed) / moves)


def _root_mean(variance: Array) -> float:
    return float(np.sqrt(np.mean(variance)))


def sentence(blows: Sequence[Blow], running: str = "running", units: str = "SI") -> str:
    """The best blow in words, or that none is worth it."""
    if not blows:
        return (
            "every computed mode in the range was seen in every state that can be tapped; a "
            "further tap would add little"
        )
    best = blows[0]
    doubt = f"{best.about} from {figure(best.sd_before)} to {figure(best.sd_after)}"
    if best.settles is None and best.sd_before < MODEL_ERROR:
        return (
            f"a further tap would add little: {best.about} are known to "
            f"{figure(best.sd_before)}, less than the error of the model itself"
        )
    if best.gain < WORTHWHILE:
        return f"a further tap would add little: the best would cut the doubt about {doubt}"
    text = f"{place(best, running, units)}: expected to cut the doubt about {doubt}{_shows(best)}"
    if best.settles is not None:
        text += (
            f"; it would settle whether that change works in {_of_ten(best.settles)} of 10 cases"
        )
    return text


def place(blow: Blow, running: str = "running", units: str = "SI") -> str:
    """Where and how to strike."""
    as_it_runs = (
        ", with the line as it runs (full and warm) and the machine stopped"
        if blow.state == running
        else ""
    )
    return (
        f"tap in {blow.direction} direction near {show(blow.at_m, 'length', units, 3)} with the "
        f"sensor beside it{as_it_runs}"
    )


def _shows(blow: Blow) -> str:
    if not blow.modes:
        return ""
    widest = max(blow.modes, key=lambda mode: mode.high_hz / mode.low_hz)
    return (
        f"; it shows the {widest.direction} mode expected between {widest.low_hz:.1f} and "
        f"{widest.high_hz:.1f} Hz"
    )


def figure(sd: float) -> str:
    """A relative doubt, two digits."""
    return f"{float(f'{100 * sd:.2g}'):g} %"


def _of_ten(chance: float) -> str:
    return f"{10 * chance:.0f}"
