"""Measured modes beside the computed ones they are taken for, and what was not seen."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.evidence import Evidence
from fieldkit.detune.field import AXES, Field
from fieldkit.detune.matched import ModelMode, Pair
from fieldkit.detune.peak_groups import Group
from fieldkit.detune.tracking import follow, followed
from fieldkit.detune.visible import FREE_HZ
from fieldkit.signal.modes import MeasuredMode

Array = NDArray[np.float64]

BELONGS = 0.5
"""A peak is paired when it belongs to some mode with at least this probability."""
MOST_MODES = 12


def pairs_of(
    groups: Sequence[Group],
    seen: Sequence[Field],
    belonging: Sequence[Array],
    handbook_hz: float | None,
) -> tuple[tuple[Pair, ...], tuple[MeasuredMode, ...]]:
    """Pairs and unpaired peaks of every group, whose state is ``seen`` by the ensemble.

    ``belonging`` holds (members, peaks, modes) for each group: how surely a peak is a mode.
    """
    pairs: list[Pair] = []
    unpaired: list[MeasuredMode] = []
    for group, state, own in zip(groups, seen, belonging, strict=True):
        followed_modes = _Followed.of(state, own.shape[2])
        share = followed_modes.probability(own)
        for i, measured in enumerate(group.modes):
            best = int(np.argmax(share[i]))
            if share[i, best] < BELONGS * share[i].sum() or share[i].sum() < BELONGS:
                unpaired.append(measured)
            else:
                pairs.append(followed_modes.pair(best, measured, handbook_hz))
    pairs.sort(key=lambda pair: pair.measured.frequency_hz)
    return tuple(pairs), tuple(unpaired)


@dataclass(frozen=True)
class _Followed:
    """Modes of one state followed through the ensemble."""

    frequency_hz: Array
    """(members, modes)."""
    chosen: NDArray[np.intp]
    prior_hz: Array
    direction: tuple[str, ...]

    @classmethod
    def of(cls, seen: Field, count: int) -> _Followed:
        frequency, share = seen.modes.frequency_hz, seen.direction_share(seen.modes.vector)
        reference = frequency[seen.central, :count], share[seen.central, :count]
        chosen = follow(frequency, share, *reference)
        prior = seen.model.modes(np.zeros((1, seen.z.shape[1])))
        prior_share = seen.direction_share(prior.vector)
        prior_chosen = follow(prior.frequency_hz, prior_share, *reference)
        return cls(
            followed(frequency, chosen),
            chosen,
            followed(prior.frequency_hz, prior_chosen)[0],
            tuple(AXES[i] for i in np.argmax(reference[1], axis=1)),
        )

    def probability(self, belonging: Array) -> Array:
        """(peaks, modes) that a peak belongs to a followed mode."""
        _, peaks, modes = belonging.shape
        inside = self.chosen < modes
        index = np.minimum(self.chosen, modes - 1)[:, None, :].repeat(peaks, axis=1)
        taken = np.take_along_axis(belonging, index, axis=2)
        return np.asarray((taken * inside[:, None, :]).mean(axis=0))

    def pair(self, j: int, measured: MeasuredMode, handbook_hz: float | None) -> Pair:
        low, median, high = np.quantile(self.frequency_hz[:, j], (0.05, 0.5, 0.95))
        vibrating = int(np.sum(np.median(self.frequency_hz, axis=0)[:j] > FREE_HZ))
        return Pair(
            vibrating + 1,
            measured,
            float(self.prior_hz[j]),
            float(median),
            float(low),
            float(high),
            self.direction[j],
            handbook_hz if vibrating == 0 else None,
        )


def model_modes(seen: Field) -> tuple[ModelMode, ...]:
    """Modes of the ensemble with their intervals, direction and where they move most."""
    frequency, share = seen.modes.frequency_hz, seen.direction_share(seen.modes.vector)
    count = min(frequency.shape[1], MOST_MODES)
    reference = frequency[seen.central, :count], share[seen.central, :count]
    tracked = followed(frequency, follow(frequency, share, *reference))
    found = []
    for j in range(count):
        low, median, high = np.quantile(tracked[:, j], (0.05, 0.5, 0.95))
        if median > FREE_HZ:
            where = seen.largest_at(seen.central, j)
            direction = AXES[int(np.argmax(reference[1][j]))]
            found.append(ModelMode(float(median), float(low), float(high), direction, where))
    return tuple(sorted(found, key=lambda mode: mode.median_hz))


def next_measurement(modes: Sequence[ModelMode], pairs: Sequence[Pair], evidence: Evidence) -> str:
    """Which further blow would narrow the answer most, from the spread of what was not seen."""
    seen = {round(pair.model_hz, 6) for pair in pairs}
    highest = 1.2 * max(m.frequency_hz for m in evidence.modes)
    unseen = [m for m in modes if round(m.median_hz, 6) not in seen and m.median_hz < highest]
    if not unseen:
        return (
            "every computed mode in the range was seen; a further tap would add little, unless the "
            "span can be tapped in its running state (full and warm)"
        )
    widest = max(unseen, key=lambda mode: (mode.high_hz - mode.low_hz) / mode.median_hz)
    return (
        f"tap in {widest.direction} direction near {widest.where_m:.2f} m with the sensor beside "
        f"it: the {widest.direction} mode expected between {widest.low_hz:.1f} and "
        f"{widest.high_hz:.1f} Hz was not seen, and it is the least certain one"
    )
