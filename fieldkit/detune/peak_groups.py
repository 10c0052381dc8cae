"""Measured modes as groups of peaks, and what the sensor of each group could see."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.evidence import RUNNING
from fieldkit.detune.likelihood import (
    DOUBTFUL_PEAK_RATE,
    FALSE_PEAK_RATE,
    MODEL_ERROR,
    RUNNING_DETECTION,
    RUNNING_FALSE_RATE,
    RUNNING_MODEL_ERROR,
    Peaks,
)
from fieldkit.detune.problem import Seen
from fieldkit.detune.reduced import ReducedModel
from fieldkit.signal.modes import MeasuredMode
from fieldkit.span.layout import Span

Array = NDArray[np.float64]

RUNNING_SHARE = 0.5
"""Running peaks weigh at most this share of as many peaks of taps (common practice, no source)."""
SENSED_STATIONS = 15
"""Places along the pipe that tell how much a mode moves at all."""
FAINT = 0.02
HEAVY_DAMPING = 0.06
MARGIN_ABOVE_TYPED = 1.08
"""Typed-in peaks: nobody looked for modes higher than this times the highest one."""

_Key = tuple[str, str | None, float | None, bool]
"""State, direction, station, and whether found while running."""


@dataclass(frozen=True)
class Group:
    """Measured modes of one state and direction."""

    modes: tuple[MeasuredMode, ...]
    peaks: Peaks


def grouped(modes: Sequence[MeasuredMode], up_to_hz: float) -> tuple[Group, ...]:
    """Peaks by state, direction, station and source, each in rising frequency."""
    weight = running_weight(modes)
    keys = dict.fromkeys(_group_key(m) for m in modes)
    groups = []
    for key in keys:
        own = sorted((m for m in modes if _group_key(m) == key), key=lambda m: m.frequency_hz)
        frequency = np.array([m.frequency_hz for m in own])
        running = own[0].source == RUNNING
        recorded = running or any(m.taps for m in own)
        highest = up_to_hz if recorded else MARGIN_ABOVE_TYPED * float(frequency.max())
        peaks = Peaks(
            frequency,
            np.array([max(m.frequency_sd_hz, 1e-4 * m.frequency_hz) for m in own]),
            own[0].direction,
            own[0].state,
            max(highest, 1.02 * float(frequency.max())),
            np.array([_false_rate(m) for m in own]),
            model_error=(RUNNING_MODEL_ERROR if running else MODEL_ERROR)
            * _places(keys, key) ** 0.5,
            shown=RUNNING_DETECTION if running else 1.0,
            weight=weight if running else 1.0,
        )
        groups.append(Group(tuple(own), peaks))
    return tuple(groups)


def _group_key(mode: MeasuredMode) -> _Key:
    return mode.state, mode.direction, mode.at_m, mode.source == RUNNING


def _places(keys: Iterable[_Key], key: _Key) -> int:
    """At how many stations the modes of a group were looked for in its direction.

    The model errs in a mode by the same amount wherever that mode is measured: peaks of one mode
    from several stations together must not say more of the model than one does.
    """
    state, direction, _, running = key
    return sum((k[0], k[1], k[3]) == (state, direction, running) for k in keys)


def running_weight(modes: Sequence[MeasuredMode]) -> float:
    """Weight of peaks found while running: all of them together stay below those of taps."""
    running = sum(m.source == RUNNING for m in modes)
    firm = len(modes) - running
    return min(1.0, RUNNING_SHARE * firm / running) if firm and running else 1.0


def _false_rate(mode: MeasuredMode) -> float:
    """How often such a peak belongs to no mode of the span."""
    usual = RUNNING_FALSE_RATE if mode.source == RUNNING else FALSE_PEAK_RATE
    return max(usual, DOUBTFUL_PEAK_RATE) if _doubtful(mode) else usual


def _doubtful(mode: MeasuredMode) -> bool:
    """Whether a peak is faint, or damped more than pipework at these amplitudes usually is."""
    return mode.strength < FAINT or (mode.damping_ratio or 0.0) > HEAVY_DAMPING


def seen_by(span: Span, models: Sequence[ReducedModel], number: int, group: Group) -> Seen:
    """The peaks of a group with what its sensor sees of the modes of one of the models."""
    model = models[number]
    stations = np.linspace(0, span.length_m, SENSED_STATIONS)
    at_m = group.modes[0].at_m
    axes = (group.peaks.direction,) if group.peaks.direction else ("vertical", "lateral", "axial")
    places = stations if at_m is None else np.array([at_m])
    return Seen(
        group.peaks,
        number,
        _motion(model, places, axes),
        _motion(model, stations, ("vertical", "lateral", "axial")),
    )


def _motion(model: ReducedModel, stations: Array, axes: Sequence[str]) -> Array:
    """(k, r) rows scaled so that their squares add up to the mean square over the stations."""
    rows = [
        model.structure.motion_rows(float(station), axis) for station in stations for axis in axes
    ]
    return np.asarray(np.concatenate(rows) @ model.basis / np.sqrt(len(stations)))
