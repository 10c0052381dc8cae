"""The pipe as it really is: hidden from the program, drawn from the doubts or from worse ones."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from fieldkit.detune.fixes import AddMass, AddSupport, AllOf, Change, MoveMass, MoveSupport, SetMass
from fieldkit.detune.fixes import StiffenSupport as Stiffen
from fieldkit.detune.unknowns import (
    StationMap,
    Unknown,
    member_span,
    member_state,
    station_map,
    unknowns_of,
)
from fieldkit.span.layout import Span, State
from tests.bench.promises.exact import ExactMode, exact_modes
from tests.bench.promises.families import Described

Draw = np.random.Generator

LIKE, UNLIKE = "like the priors", "unlike the priors"
MOST_MOVED = 4.0
"""Largest factor between the median of the plant's supports and what is usual."""
OTHER_SPREAD = (0.5, 1.3)
DISCREPANCY = 0.008
"""Relative, of each mode's frequency: what no beam has, such as welds, ovality and play."""
HELD_DISCREPANCY = 0.8
"""Correlation of that between the pipe as tapped and the same mode after a change."""
STIFFNESS_SCATTER_LN = 0.35
PLACE_SCATTER_M = 0.015


@dataclass(frozen=True)
class Truth:
    """A plant nobody can look into."""

    span: Span
    tapped: State
    running: State
    moved: StationMap
    tapped_error: np.ndarray
    """(directions, modes) relative."""
    running_error: np.ndarray

    def tapped_modes(self, below_hz: float) -> tuple[ExactMode, ...]:
        """As a tap would find them without noise."""
        return _off(exact_modes(self.span, self.tapped, 1.05 * below_hz), self.tapped_error)

    def running_modes(self, span: Span, below_hz: float) -> tuple[ExactMode, ...]:
        """In the running state, of this span or of a changed one."""
        return _off(exact_modes(span, self.running, 1.05 * below_hz), self.running_error)


def hidden(job: Described, way: str, rng: Draw) -> Truth:
    """Draw the plant behind a job."""
    unknowns = unknowns_of(job.span, (job.tapped, job.running))
    really = tuple(_elsewhere(u, rng) for u in unknowns) if way == UNLIKE else unknowns
    z = rng.standard_normal(len(unknowns))
    error = rng.standard_normal((2, 3, 40))
    after = HELD_DISCREPANCY * error[0] + np.sqrt(1 - HELD_DISCREPANCY**2) * error[1]
    return Truth(
        member_span(job.span, really, z),
        member_state(job.tapped, really, z),
        member_state(job.running, really, z),
        station_map(job.span, really, z),
        DISCREPANCY * error[0],
        DISCREPANCY * after,
    )


def _elsewhere(unknown: Unknown, rng: Draw) -> Unknown:
    """The doubt a plant of other habits would deserve."""
    factor = MOST_MOVED ** rng.uniform(-1, 1)
    spread = rng.uniform(*OTHER_SPREAD)
    if unknown.role != "spring":
        return unknown
    return replace(unknown, centre=factor * unknown.centre, spread=spread * unknown.spread)


def _off(modes: tuple[ExactMode, ...], error: np.ndarray) -> tuple[ExactMode, ...]:
    seen = {"vertical": 0, "lateral": 0, "axial": 0}
    found = []
    for mode in modes:
        row, number = list(seen).index(mode.direction), seen[mode.direction]
        seen[mode.direction] += 1
        factor = 1 + error[row, min(number, error.shape[1] - 1)]
        found.append(replace(mode, frequency_hz=factor * mode.solved_hz))
    return tuple(sorted(found, key=lambda mode: mode.frequency_hz))


def installed(change: Change, truth: Truth, job: Described, rng: Draw) -> Span:
    """The plant with a change built into it, as fitters build."""
    if isinstance(change, AllOf):
        span = truth.span
        for part in change.parts:
            span = installed(part, replace(truth, span=span), job, rng)
        return span
    stiffer = float(np.exp(STIFFNESS_SCATTER_LN * rng.standard_normal()))
    beside = PLACE_SCATTER_M * rng.standard_normal()
    return _on_site(change, truth, job, stiffer, beside).apply(truth.span)


def _on_site(change: Change, truth: Truth, job: Described, stiffer: float, beside: float) -> Change:
    span = truth.span

    def place(at_m: float) -> float:
        return float(np.clip(truth.moved(at_m) + beside, 0.0, span.length_m))

    if isinstance(change, AddSupport):
        axes = ("vertical_n_per_m", "lateral_n_per_m", "axial_n_per_m", "rotation_n_m_per_rad")
        stiffness = {axis: _times(getattr(change, axis), stiffer) for axis in axes}
        return replace(change, at_m=place(change.at_m), **stiffness)
    if isinstance(change, AddMass):
        return replace(change, at_m=place(change.at_m))
    if isinstance(change, MoveSupport | MoveMass):
        return replace(change, to_m=place(change.to_m))
    if isinstance(change, SetMass):
        factor = span.masses[change.index].mass_kg / job.span.masses[change.index].mass_kg
        return replace(change, mass_kg=factor * change.mass_kg)
    if isinstance(change, Stiffen):
        old = span.supports[change.index]
        return replace(
            change,
            vertical_n_per_m=_at_least(_times(change.vertical_n_per_m, stiffer), old.vertical),
            lateral_n_per_m=_at_least(_times(change.lateral_n_per_m, stiffer), old.lateral),
        )
    raise AssertionError(f"the plant cannot build {change}")


def _times(stiffness: float | None, factor: float) -> float | None:
    return None if stiffness is None else factor * stiffness


def _at_least(new: float | None, old: float | str) -> float | None:
    return new if new is None or isinstance(old, str) else max(new, old)
