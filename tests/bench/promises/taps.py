"""What a day of tapping gives: peaks with noise; some missing, false, crossed or merged."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from fieldkit.detune.evidence import Evidence
from fieldkit.signal.modes import MeasuredMode
from tests.bench.promises.exact import PLANES, ExactMode, motion
from tests.bench.promises.families import Described
from tests.bench.promises.truth import Truth

Draw = np.random.Generator

LEAST_SHOWN, MOST_SHOWN = 0.15, 0.95
"""Chance that a mode shows where the sensor hardly moves, and where it moves as elsewhere."""
FALSE_SHARE = 0.06
CROSSED_SHARE = 0.06
MERGED_WITHIN = 0.012
"""Two modes closer than this, relative, give one peak."""
NOISE = (-3.7, -2.7)
"""Powers of ten of the relative deviation of a measured frequency."""


def tapped(job: Described, truth: Truth, rng: Draw) -> Evidence:
    """Both directions at one sensor place, or at two."""
    places = rng.uniform(*job.taps_between_m, size=rng.integers(1, 3))
    nominal = [round(float(at), 2) for at in places]
    found = [
        mode for at in nominal for plane in PLANES for mode in _seen(job, truth, at, plane, rng)
    ]
    return Evidence(tuple(sorted(found, key=lambda mode: mode.frequency_hz)))


def _seen(job: Described, truth: Truth, at_m: float, plane: str, rng: Draw) -> list[MeasuredMode]:
    modes = truth.tapped_modes(job.up_to_hz)
    own = [m for m in modes if m.direction == plane]
    other = np.array([m.frequency_hz for m in modes if m.direction not in (plane, "axial")])
    frequency = np.array([m.frequency_hz for m in own])
    shown = frequency[rng.random(len(own)) < _chance(truth, at_m, plane, own)]
    crossed = other[rng.random(len(other)) < CROSSED_SHARE]
    false = rng.uniform(5.0, job.up_to_hz, rng.binomial(len(own), FALSE_SHARE))
    return [
        _measured(f, at_m, plane, rng)
        for f in _merged(np.sort(np.concatenate([shown, crossed, false])))
        if f < job.up_to_hz
    ]


def _chance(truth: Truth, at_m: float, plane: str, modes: Sequence[ExactMode]) -> np.ndarray:
    """How often each mode shows, by its motion at the sensor against that along the pipe."""
    if not modes:
        return np.empty(0)
    solved = np.array([mode.solved_hz for mode in modes])
    places = [truth.moved(at_m), *np.linspace(0.02, 0.98, 13) * truth.span.length_m]
    shape = motion(truth.span, truth.tapped, plane, solved, places)
    usual = np.sqrt(np.mean(shape[:, 1:] ** 2, axis=1))
    share = np.minimum(np.abs(shape[:, 0]) / usual, 1.0)
    return np.asarray(LEAST_SHOWN + (MOST_SHOWN - LEAST_SHOWN) * share)


def _merged(frequency_hz: np.ndarray) -> list[float]:
    """Peaks too close to be told apart become one between them."""
    found: list[float] = []
    for f in frequency_hz:
        if found and f < (1 + MERGED_WITHIN) * found[-1]:
            found[-1] = 0.5 * (found[-1] + float(f))
        else:
            found.append(float(f))
    return found


def _measured(frequency_hz: float, at_m: float, plane: str, rng: Draw) -> MeasuredMode:
    sd = frequency_hz * 10 ** rng.uniform(*NOISE)
    return MeasuredMode(
        frequency_hz + sd * rng.standard_normal(),
        sd,
        0.01,
        0.001,
        plane,
        taps=5,
        strength=float(rng.uniform(0.1, 1.0)),
        state="tapped",
        at_m=at_m,
    )
