"""Modes followed through joint members, and which of them a measured peak is."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.field import AXES
from fieldkit.detune.likelihood import MODEL_ERROR
from fieldkit.detune.match import SENSED_STATIONS
from fieldkit.detune.reduced import Modes, ReducedModel
from fieldkit.detune.tracking import central_member, follow, followed
from fieldkit.detune.visible import FREE_HZ
from fieldkit.span.layout import Span

Array = NDArray[np.float64]

RANGE = 1.3
"""Modes up to this many times the limit are followed."""
BELONGS = 0.5


@dataclass(frozen=True)
class Tracked:
    """The vibrating modes of one state, followed through the members."""

    modes: Modes
    frequency_hz: Array
    """(members, labels)."""
    chosen: NDArray[np.intp]
    """(members, labels) number of the mode."""
    direction: tuple[str, ...]
    central: int
    share: Array
    """(labels, 3) of the middle member's motion along AXES."""
    every_share: Array
    """(modes, 3) the same of all its modes."""

    def probability(self, belonging: Array) -> Array:
        """(peaks, labels) from responsibilities (members, peaks, modes)."""
        _, peaks, modes = belonging.shape
        inside = self.chosen < modes
        index = np.minimum(self.chosen, modes - 1)[:, None, :].repeat(peaks, axis=1)
        taken = np.take_along_axis(belonging, index, axis=2)
        return np.asarray((taken * inside[:, None, :]).mean(axis=0))

    def interval(self, label: int) -> tuple[float, float, float]:
        """5 %, median and 95 % of a frequency, the error of the model in it."""
        rng = np.random.default_rng(label)
        doubt = 1 + MODEL_ERROR * rng.standard_normal(len(self.frequency_hz))
        low, median, high = np.quantile(self.frequency_hz[:, label] * doubt, (0.05, 0.5, 0.95))
        return float(low), float(median), float(high)


def tracked(
    span: Span, model: ReducedModel, z: Array, up_to_hz: float, like: Tracked | None = None
) -> Tracked:
    """Follow every vibrating mode from the middle member, or from ``like`` in another state."""
    modes = model.modes(z)
    frequency, share = modes.frequency_hz, _shares(span, model, modes)
    if like is None:
        central = central_member(z)
        count = max(1, int(np.sum(frequency[central] < RANGE * up_to_hz)))
        first = int(np.sum(frequency[central, :count] < FREE_HZ))
        own = np.arange(min(first, count - 1), count)
    else:
        central, middle = like.central, slice(like.central, like.central + 1)
        scale = _common_scale(frequency[central], like)
        here = frequency[middle] * scale
        own = follow(here, share[middle], like.frequency_hz[central], like.share)[0]
    reference = frequency[central, own], share[central, own]
    chosen = follow(frequency, share, *reference)
    directions = tuple(AXES[int(i)] for i in np.argmax(reference[1], axis=1))
    tracked_hz = followed(frequency, chosen)
    return Tracked(modes, tracked_hz, chosen, directions, central, reference[1], share[central])


def _common_scale(frequency_hz: Array, like: Tracked) -> float:
    """By how much the vibrating modes lie higher in the other state, on the whole."""
    alive = frequency_hz[frequency_hz > FREE_HZ]
    known = np.sort(like.frequency_hz[like.central])
    count = min(len(alive), len(known))
    return float(np.median(known[:count] / alive[:count])) if count else 1.0


def _shares(span: Span, model: ReducedModel, modes: Modes) -> Array:
    """(members, modes, 3) share of the motion along AXES."""
    stations = np.linspace(0.0, span.length_m, SENSED_STATIONS)
    energy = []
    for axis in AXES:
        rows = [model.structure.motion_rows(float(station), axis) for station in stations]
        seen = np.concatenate(rows) @ model.basis
        energy.append(np.sum((seen @ modes.vector) ** 2, axis=1))
    total = np.stack(energy, axis=2)
    return np.asarray(total / np.maximum(total.sum(axis=2, keepdims=True), 1e-300))


@dataclass(frozen=True)
class Taken:
    """A measured peak and the followed mode it is taken for."""

    group: int
    peak: int
    label: int


def taken(shares: Sequence[Array]) -> tuple[Taken, ...]:
    """Peaks that belong to one mode more likely than not; ``shares`` (peaks, labels) by group."""
    return tuple(
        Taken(number, i, int(np.argmax(row)))
        for number, share in enumerate(shares)
        for i, row in enumerate(share)
        if row.max(initial=0.0) >= BELONGS
    )


def linked(now: Tracked, promise: Tracked) -> dict[int, int]:
    """Which promised mode each mode is, by its place in the order of its direction.

    A stiffness, a mass or a place that is off moves a mode and does not make it overtake another
    one that moves the same way.
    """
    places = {place: label for label, place in enumerate(_places(promise))}
    return {i: places[place] for i, place in enumerate(_places(now)) if place in places}


def _places(found: Tracked) -> list[tuple[str, int]]:
    """Direction and number in rising frequency of each mode."""
    median = np.median(found.frequency_hz, axis=0)
    own = [
        [i for i in np.argsort(median) if found.direction[i] == direction]
        for direction in found.direction
    ]
    return [(found.direction[i], own[i].index(i)) for i in range(len(median))]


def along_path(
    span: Span, model: ReducedModel, now: Tracked, path: Array, promise: Tracked
) -> dict[int, int]:
    """The same followed step by step while the change is brought back to how it was drawn.

    ``path`` is (steps, joint) from the middle member of ``now`` to that member as drawn.
    """
    modes = model.modes(path)
    frequency, share = modes.frequency_hz, _shares(span, model, modes)
    label = now.chosen[now.central]
    for step in range(1, len(path)):
        here = slice(step, step + 1)
        before = frequency[step - 1, label], share[step - 1, label]
        label = follow(frequency[here], share[here], *before)[0]
    end = frequency[-1, label], share[-1, label]
    central = promise.central
    every_hz = promise.modes.frequency_hz[central]
    back = follow(every_hz[None], promise.every_share[None], *end)[0]
    labels = {int(number): i for i, number in enumerate(promise.chosen[central])}
    return {i: labels[int(number)] for i, number in enumerate(back) if int(number) in labels}
