"""The members of an ensemble in a span that was changed: what a fix does to each of them."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.excitation import Band
from fieldkit.detune.fixes import Change
from fieldkit.detune.reduced import build
from fieldkit.detune.unknowns import Unknown, unknowns_of
from fieldkit.detune.visible import FREE_HZ
from fieldkit.span.layout import Span, State
from fieldkit.span.structure import segments

Array = NDArray[np.float64]


def frequencies_after(
    span: Span, states: tuple[State, State], z: Array, change: Change, up_to_hz: float
) -> Array:
    """(members, r) natural frequencies of the running state with the change, in hertz."""
    changed = change.apply(span)
    before, after = unknowns_of(span, states), unknowns_of(changed, states)
    model = build(changed, states[1], after, up_to_hz)
    return model.modes(carried(span, changed, before, after, z)).frequency_hz


def carried(
    span: Span, changed: Span, before: Sequence[Unknown], after: Sequence[Unknown], z: Array
) -> Array:
    """(members, new parameters): each unknown keeps its number, a part of a stretch its whole's.

    What the change brings with it is taken as drawn.
    """
    column = {_key(unknown): i for i, unknown in enumerate(before)}
    whole = segments(span)
    found = np.zeros((len(z), len(after)))
    for j, unknown in enumerate(after):
        key = _key(unknown)
        if unknown.role == "length":
            a, b = segments(changed)[unknown.index]
            middle = 0.5 * (a + b)
            inside = [i for i, (low, high) in enumerate(whole) if low <= middle <= high]
            key = ("length", inside[0] if inside else -1, "")
        if key in column:
            found[:, j] = z[:, column[key]]
    return found


def _key(unknown: Unknown) -> tuple[str, int, str]:
    return unknown.role, unknown.index, unknown.state


def clearance(frequency_hz: Array, forbidden: Sequence[Band], up_to_hz: float) -> Array:
    """(members,) how far the worst mode lies outside every band; negative inside one.

    In ln of frequency, to the nearest edge.
    """
    log_hz = np.log(np.maximum(frequency_hz, FREE_HZ))
    worst = np.full(len(frequency_hz), np.inf)
    counted = (frequency_hz > FREE_HZ) & (frequency_hz < up_to_hz)
    for band in forbidden:
        low, high = np.log(max(band.avoid_low_hz, 1e-3)), np.log(band.avoid_high_hz)
        outside = np.maximum(low - log_hz, log_hz - high)
        outside[~counted] = np.inf
        worst = np.minimum(worst, outside.min(axis=1))
    return worst
