"""Whether every mode is clear of every band now, measured frequencies judged as measured.

A frequency measured in the state the pipe runs in counts as it is. In another state every member
of the updated ensemble tells by how much its own mode differs between the two, and the measured
frequency is carried over by that; modes that were not seen are the ensemble's own, and keep the
margin of a predicted frequency.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.excitation import Band, Excitation, Goal, bands, clear_of_all
from fieldkit.detune.judge import chance_of
from fieldkit.detune.known_modes import TAP_TO_RUNNING
from fieldkit.detune.likelihood import MODEL_ERROR
from fieldkit.detune.recheck_answer import FAILED, UNSURE, WORKED, RunningMode
from fieldkit.detune.recheck_modes import Tracked
from fieldkit.signal.modes import MeasuredMode

Array = NDArray[np.float64]

CONVERSION_ERROR = 0.004
"""What no parameter accounts for in the ratio of one mode in two states: half of what it is in the
frequency, most of which both share (common practice, no source)."""
SEED = 31
NEAR_HZ = 0.2


@dataclass(frozen=True)
class Judged:
    """The modes now, and how sure it is that all, or those that were measured, are clear."""

    modes: tuple[RunningMode, ...]
    chance: float
    chance_measured: float
    """That every measured mode is clear; 1 where none was."""
    stray_in_band: bool
    """A peak that belongs to no mode lies in a band."""


@dataclass(frozen=True)
class Now:
    """The updated ensemble in the state of the re-tap and running, and the peaks in it."""

    tapped: Tracked
    running: Tracked
    """Labels as in ``tapped``."""
    measured: Mapping[int, MeasuredMode]
    """By label."""
    stray: Sequence[MeasuredMode]
    same_state: bool


def judged(now: Now, excitations: Sequence[Excitation], goal: Goal) -> Judged:
    """Every mode up to the goal's limit against every band."""
    rng = np.random.default_rng(SEED)
    close, wide = bands(excitations, goal.margin_measured), bands(excitations, goal.margin)
    members, labels = now.running.frequency_hz.shape
    every, firm = np.ones(members, dtype=bool), np.ones(members, dtype=bool)
    modes = []
    for label in range(labels):
        measured = now.measured.get(label)
        frequency = _as_running(now, label, rng)
        forbidden = close if measured else wide
        clear = clear_of_all(frequency, forbidden) | (frequency > goal.up_to_hz)
        every &= clear
        firm &= clear if measured else True
        if measured or np.quantile(frequency, 0.05) <= goal.up_to_hz:
            margin = goal.margin_measured if measured else goal.margin
            modes.append(
                _mode(now.running.direction[label], frequency, measured, forbidden, margin, clear)
            )
    return Judged(
        tuple(sorted(modes, key=lambda mode: mode.median_hz)),
        chance_of(every),
        chance_of(firm) if now.measured else 1.0,
        any(not clear_of_all(_stray_hz(now, m), close).all() for m in now.stray),
    )


def _as_running(now: Now, label: int, rng: np.random.Generator) -> Array:
    """(members,) frequency of a mode as the pipe runs."""
    computed, measured = now.running.frequency_hz[:, label], now.measured.get(label)
    white = rng.standard_normal(len(computed))
    if measured is None:
        return np.asarray(computed * (1 + MODEL_ERROR * white))
    own = measured.frequency_sd_hz / measured.frequency_hz
    if now.same_state:
        return np.asarray(measured.frequency_hz * (1 + np.hypot(own, TAP_TO_RUNNING) * white))
    ratio = computed / now.tapped.frequency_hz[:, label]
    doubt = float(np.linalg.norm([own, TAP_TO_RUNNING, CONVERSION_ERROR]))
    return np.asarray(measured.frequency_hz * ratio * (1 + doubt * white))


def _stray_hz(now: Now, mode: MeasuredMode) -> Array:
    """Carried over as the modes are on the whole."""
    if now.same_state:
        return np.array([mode.frequency_hz])
    ratio = now.running.frequency_hz / np.maximum(now.tapped.frequency_hz, NEAR_HZ)
    return np.asarray(mode.frequency_hz * np.quantile(ratio, (0.25, 0.5, 0.75)))


def _mode(
    direction: str,
    frequency: Array,
    measured: MeasuredMode | None,
    forbidden: Sequence[Band],
    margin: float,
    clear: NDArray[np.bool_],
) -> RunningMode:
    low, median, high = (float(f) for f in np.quantile(frequency, (0.05, 0.5, 0.95)))
    nearest = min(forbidden, key=lambda band: band.separation(median), default=None)
    return RunningMode(
        direction, low, median, high,
        measured.frequency_hz if measured else None,
        margin,
        float(clear.mean()),
        nearest.name if nearest else "",
        nearest.separation(median) if nearest else 1.0,
    )  # fmt: skip


def verdict(found: Judged, goal: Goal) -> tuple[str, str]:
    """(verdict, why) in words."""
    inside = [m for m in found.modes if m.measured_hz is not None and m.chance_clear < 0.5]
    unseen = [m for m in found.modes if m.measured_hz is None and m.chance_clear < goal.chance]
    doubtful = [
        m for m in found.modes if m.measured_hz is not None and m.chance_clear < goal.chance
    ]
    if not any(m.measured_hz is not None for m in found.modes):
        return UNSURE, "no measured peak belongs to a mode of the span as described"
    if found.chance_measured <= 1 - goal.chance and inside:
        return FAILED, "; ".join(_in_band(mode) for mode in inside)
    if found.stray_in_band:
        return UNSURE, "a peak that belongs to no mode of the span lies near an excitation"
    if found.chance >= goal.chance:
        return WORKED, "every mode is clear of every excitation, the measured ones as measured"
    if doubtful:
        return UNSURE, "; ".join(_near_edge(mode) for mode in doubtful)
    if unseen:
        return UNSURE, "; ".join(
            f"the {m.direction} mode expected at {m.low_hz:.1f} to {m.high_hz:.1f} Hz running was "
            f"not seen, and may come near {m.band}"
            for m in unseen
        )
    return UNSURE, f"all modes together are clear with a chance of {100 * found.chance:.0f} % only"


def _in_band(mode: RunningMode) -> str:
    return (
        f"the {mode.direction} mode measured at {mode.measured_hz:.1f} Hz runs at "
        f"{mode.median_hz:.1f} Hz, {_apart(mode)} {mode.band}"
    )


def _near_edge(mode: RunningMode) -> str:
    return (
        f"the {mode.direction} mode measured at {mode.measured_hz:.1f} Hz runs at "
        f"{mode.low_hz:.1f} to {mode.high_hz:.1f} Hz, about {100 * mode.separation:.0f} % from "
        f"{mode.band}, where {100 * mode.margin:.0f} % are wanted"
    )


def _apart(mode: RunningMode) -> str:
    if mode.separation == 0:
        return "inside"
    return f"{100 * mode.separation:.0f} % from"
