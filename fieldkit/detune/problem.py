"""What the posterior is made of: models, peaks, and how well a parameter set explains them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.likelihood import Alignment, Peaks, align, detection, peak_variance
from fieldkit.detune.likelihood import log_likelihood as peaks_likelihood
from fieldkit.detune.reduced import Modes, ReducedModel

Array = NDArray[np.float64]

DAMPED_RANGE = 1.25
"""Modes up to this many times the highest analysed frequency enter the alignment; beyond, the
chance to show is below one in a hundred thousand."""
BESIDE = 8
"""Modes above those, among which the shapes of another state are sought."""


@dataclass(frozen=True)
class Seen:
    """Peaks of one direction with the model of the state they were measured in."""

    peaks: Peaks
    model: int
    """Which of the models."""
    rows: Array
    """(k, r) motion the sensor direction sees at the sensor, or everywhere along the pipe."""
    reference_rows: Array
    """(q, r) motion in every direction at the same places."""


@dataclass(frozen=True)
class Problem:
    """What the posterior is made of."""

    models: tuple[ReducedModel, ...]
    seen: tuple[Seen, ...]
    alike: bool = False
    """Whether the models are one pipe on one mesh in several states: the modes of all but the first
    used are then sought among those of the first (Ritz), whose shapes contents and temperature
    hardly change."""

    @property
    def parameters(self) -> int:
        """Number of unknowns."""
        return len(self.models[0].unknowns)

    @property
    def used(self) -> tuple[int, ...]:
        """Models of the states in which something was measured."""
        return tuple(sorted({seen.model for seen in self.seen}))

    def modes(self, z: Array) -> dict[int, Modes]:
        """Modes of the used models for every member (members, parameters)."""
        first, *others = self.used
        found = {first: self.models[first].modes(z)}
        if not self.alike:
            return found | {i: self.models[i].modes(z) for i in others}
        for i in others:
            wanted = max(self.mode_count(state, found[first]) for state in (first, i)) + BESIDE
            shapes = self._carried[i] @ found[first].vector[:, :, :wanted]
            found[i] = self.models[i].modes_among(z, shapes)
        return found

    @cached_property
    def _carried(self) -> dict[int, Array]:
        """(r', r) for each model but the first used: from the coordinates of the first to its."""
        first, *others = self.used
        own = [(i, self.models[i]) for i in others]
        return {
            i: np.asarray(m.basis.T @ (m.middle_mass @ self.models[first].basis)) for i, m in own
        }

    def mode_count(self, model: int, modes: Modes) -> int:
        """How many modes of a model can matter to its peaks."""
        highest = max(s.peaks.highest_hz for s in self.seen if s.model == model)
        below = (modes.frequency_hz < DAMPED_RANGE * highest).sum(axis=1)
        return int(min(modes.eigenvalue.shape[1], max(int(below.max()), 1)))


@dataclass(frozen=True)
class Local:
    """The posterior about each member, to second order."""

    gradient: Array
    """(members, parameters) direction of ascent of the log posterior."""
    curvature: Array
    """(members, parameters, parameters) positive definite."""
    log_likelihood: Array
    """(members,)."""

    @cached_property
    def step(self) -> Array:
        """(members, parameters) to where the normal approximation has its top."""
        return np.asarray(np.linalg.solve(self.curvature, self.gradient[:, :, None])[:, :, 0])


def seen_share(seen: Seen, modes: Modes, count: int) -> Array:
    """(members, modes) share of a mode's motion that the sensor sees, 0 to 1."""
    vector = modes.vector[:, :, :count]
    visible = np.sum((seen.rows @ vector) ** 2, axis=1)
    anywhere = np.sum((seen.reference_rows @ vector) ** 2, axis=1)
    return np.asarray(np.sqrt(visible / np.maximum(anywhere, 1e-30)))


@dataclass(frozen=True)
class Shown:
    """The modes of every member that can matter, and their chance to show to each group."""

    modes: dict[int, Modes]
    count: dict[int, int]
    frequency_hz: tuple[Array, ...]
    """For each group of peaks (members, modes)."""
    detected: tuple[Array, ...]


def shown(problem: Problem, z: Array) -> Shown:
    """Solve the used models and tell what each group of peaks could see."""
    modes = problem.modes(z)
    count = {i: problem.mode_count(i, m) for i, m in modes.items()}
    frequency, detected = [], []
    for seen in problem.seen:
        number = count[seen.model]
        frequency.append(modes[seen.model].frequency_hz[:, :number])
        share = seen_share(seen, modes[seen.model], number)
        peaks = seen.peaks
        detected.append(detection(share, frequency[-1], peaks.highest_hz, peaks.shown))
    return Shown(modes, count, tuple(frequency), tuple(detected))


def alignments(
    problem: Problem, z: Array, widening: float = 1.0
) -> tuple[list[Alignment], dict[int, Modes], dict[int, int]]:
    """Alignment of every group of peaks, with the modes of the used models and how many count."""
    seen = shown(problem, z)
    each = zip(problem.seen, seen.frequency_hz, seen.detected, strict=True)
    found = [align(group.peaks, f, d, widening=widening) for group, f, d in each]
    return found, seen.modes, seen.count


def log_likelihood(problem: Problem, z: Array) -> Array:
    """(members,) log-likelihood of all peaks."""
    seen = shown(problem, z)
    each = zip(problem.seen, seen.frequency_hz, seen.detected, strict=True)
    return weighted(problem, [peaks_likelihood(group.peaks, f, d) for group, f, d in each])


def weighted(problem: Problem, each: Sequence[Array]) -> Array:
    """(members,) log-likelihood of all groups of peaks, each with its weight."""
    values = [s.peaks.weight * value for s, value in zip(problem.seen, each, strict=True)]
    return np.asarray(np.sum(values, axis=0))


def expected(problem: Problem, z: Array, widening: float = 1.0) -> Local:
    """Ascent direction and curvature of the posterior, alignments weighed as they are now."""
    found, modes, counts = alignments(problem, z, widening)
    gradient = -z.copy()
    curvature = np.broadcast_to(np.eye(z.shape[1]), (len(z), z.shape[1], z.shape[1])).copy()
    slopes = {i: problem.models[i].frequency_slopes(z, m, counts[i]) for i, m in modes.items()}
    for seen, alignment in zip(problem.seen, found, strict=True):
        slope = slopes[seen.model]
        frequency = modes[seen.model].frequency_hz[:, : counts[seen.model]]
        share = seen.peaks.weight * alignment.responsibility
        precision = share / peak_variance(seen.peaks, frequency, widening)
        misfit = seen.peaks.frequency_hz[None, :, None] - frequency[:, None, :]
        pull = np.sum(precision * misfit, axis=1)
        weight = np.sum(precision, axis=1)
        gradient += (slope @ pull[:, :, None])[:, :, 0]
        curvature += (slope * weight[:, None, :]) @ np.swapaxes(slope, 1, 2)
    return Local(gradient, curvature, weighted(problem, [a.log_likelihood for a in found]))
