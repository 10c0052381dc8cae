"""From prior and likelihood to an ensemble: many starts, Laplace mixture, tempered population.

1. Gauss-Newton on the expected alignment (an EM iteration: Dempster, Laird and Rubin 1977) from
   many prior draws, the peak widths annealed, finds the parameter sets worth knowing.
2. Their Laplace approximations, weighted by evidence, make a mixture to draw from.
3. The draws are carried to the exact posterior by annealed importance resampling with random-walk
   moves (Neal 2001, Statistics and Computing 11, 125; Del Moral, Doucet and Jasra 2006, JRSS B 68,
   411; both from memory).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.likelihood import Alignment, Peaks, align, detection, peak_variance
from fieldkit.detune.reduced import Modes, ReducedModel
from fieldkit.progress import Progress

Array = NDArray[np.float64]

MEMBERS = 200
STARTS = 48
ANNEALING = (8.0, 5.0, 3.0, 2.0, 1.5, 1.0, 1.0, 1.0, 1.0, 1.0)
LONGEST_STEP = 1.5
MIXTURE_SIZE = 24
INFLATION = 1.3
MOVES_PER_LEVEL = 3
KEPT_EFFECTIVE_SHARE = 0.5
MOST_LEVELS = 8
DAMPED_RANGE = 1.6
"""Modes up to this many times the highest analysed frequency enter the alignment."""


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

    @property
    def parameters(self) -> int:
        """Number of unknowns."""
        return len(self.models[0].unknowns)

    @property
    def used(self) -> tuple[int, ...]:
        """Models of the states in which something was measured."""
        return tuple(sorted({seen.model for seen in self.seen}))

    def mode_count(self, model: int, modes: Modes) -> int:
        """How many modes of a model can matter to its peaks."""
        highest = max(s.peaks.highest_hz for s in self.seen if s.model == model)
        below = (modes.frequency_hz < DAMPED_RANGE * highest).sum(axis=1)
        return int(min(modes.eigenvalue.shape[1], max(int(below.max()), 1)))


@dataclass(frozen=True)
class Population:
    """Members drawn from the posterior, equally weighted."""

    z: Array
    """(members, parameters)."""
    log_likelihood: Array
    best_log_likelihood: float
    levels: int
    acceptance: float


def seen_share(seen: Seen, modes: Modes, count: int) -> Array:
    """(members, modes) share of a mode's motion that the sensor sees, 0 to 1."""
    vector = modes.vector[:, :, :count]
    visible = np.sum((seen.rows @ vector) ** 2, axis=1)
    anywhere = np.sum((seen.reference_rows @ vector) ** 2, axis=1)
    return np.asarray(np.sqrt(visible / np.maximum(anywhere, 1e-30)))


def alignments(
    problem: Problem, z: Array, widening: float = 1.0
) -> tuple[list[Alignment], dict[int, Modes], dict[int, int]]:
    """Alignment of every group of peaks, with the modes of the used models and how many count."""
    modes = {i: problem.models[i].modes(z) for i in problem.used}
    counts = {i: problem.mode_count(i, m) for i, m in modes.items()}
    found = []
    for seen in problem.seen:
        count = counts[seen.model]
        frequency = modes[seen.model].frequency_hz[:, :count]
        share = seen_share(seen, modes[seen.model], count)
        detected = detection(share, frequency, seen.peaks.highest_hz, seen.peaks.shown)
        found.append(align(seen.peaks, frequency, detected, widening=widening))
    return found, modes, counts


def log_likelihood(problem: Problem, z: Array) -> Array:
    """(members,) log-likelihood of all peaks."""
    found, _, _ = alignments(problem, z)
    return weighted(problem, found)


def weighted(problem: Problem, found: Sequence[Alignment]) -> Array:
    """(members,) log-likelihood of all groups of peaks, each with its weight."""
    each = [s.peaks.weight * a.log_likelihood for s, a in zip(problem.seen, found, strict=True)]
    return np.asarray(np.sum(each, axis=0))


def sample(problem: Problem, rng: np.random.Generator, progress: Progress) -> Population:
    """Draw the posterior; deterministic for a given generator."""
    progress.step("searching parameter sets that explain the tap", 0.0)
    optima = _optimise(problem, rng.standard_normal((STARTS, problem.parameters)), progress)
    progress.step("drawing the ensemble", 0.5)
    mixture = _mixture(optima)
    return _temper(problem, mixture, rng, progress)


@dataclass(frozen=True)
class _Optima:
    z: Array
    log_posterior: Array
    covariance: Array


@dataclass(frozen=True)
class _Mixture:
    weight: Array
    centre: Array
    factor: Array
    """(components, parameters, parameters) lower Cholesky factor."""

    def draw(self, count: int, rng: np.random.Generator) -> Array:
        which = rng.choice(len(self.weight), size=count, p=self.weight)
        noise = rng.standard_normal((count, self.centre.shape[1], 1))
        return np.asarray(self.centre[which] + (self.factor[which] @ noise)[:, :, 0])

    def log_density(self, z: Array) -> Array:
        inverse = np.linalg.inv(self.factor)
        offset = z[:, None, :] - self.centre[None]
        distance = np.einsum("cij,scj->sci", inverse, offset)
        log_volume = np.sum(np.log(np.diagonal(self.factor, axis1=1, axis2=2)), axis=1)
        constant = 0.5 * z.shape[1] * np.log(2 * np.pi)
        each = np.log(self.weight) - log_volume - constant - 0.5 * np.sum(distance**2, axis=2)
        return np.asarray(np.logaddexp.reduce(each, axis=1))

    def step(self, count: int, rng: np.random.Generator) -> Array:
        """Symmetric random-walk steps shaped like a random component."""
        which = rng.choice(len(self.weight), size=count, p=self.weight)
        parameters = self.centre.shape[1]
        scale = 2.0 / np.sqrt(parameters) * rng.choice([0.3, 1.0], size=count)
        noise = rng.standard_normal((count, parameters, 1)) * scale[:, None, None]
        return np.asarray((self.factor[which] @ noise)[:, :, 0])


def _optimise(problem: Problem, z: Array, progress: Progress) -> _Optima:
    """Gauss-Newton on the expected alignment, every start at once."""
    best = z
    best_value = np.full(len(z), -np.inf)
    for i, widening in enumerate(ANNEALING):
        progress.step("searching parameter sets that explain the tap", 0.5 * i / len(ANNEALING))
        gradient, curvature, _ = _expected(problem, z, widening)
        step = np.linalg.solve(curvature, gradient[:, :, None])[:, :, 0]
        length = np.linalg.norm(step, axis=1, keepdims=True)
        z = z + step * np.minimum(1.0, LONGEST_STEP / np.maximum(length, 1e-12))
        if widening == 1.0:
            best, best_value = _keep_better(problem, z, best, best_value)
    _, curvature, log_likelihoods = _expected(problem, best, 1.0)
    value = log_likelihoods - 0.5 * np.sum(best**2, axis=1)
    return _Optima(best, value, np.asarray(np.linalg.inv(curvature)))


def _keep_better(problem: Problem, z: Array, best: Array, best_value: Array) -> tuple[Array, Array]:
    value = log_likelihood(problem, z) - 0.5 * np.sum(z**2, axis=1)
    better = value > best_value
    return np.where(better[:, None], z, best), np.where(better, value, best_value)


def _expected(problem: Problem, z: Array, widening: float) -> tuple[Array, Array, Array]:
    """Ascent direction, curvature and log-likelihood of the posterior at each member."""
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
    return gradient, curvature, weighted(problem, found)


def _mixture(optima: _Optima) -> _Mixture:
    """Distinct optima by evidence, best first."""
    _, log_volume = np.linalg.slogdet(optima.covariance)
    evidence = optima.log_posterior + 0.5 * log_volume
    chosen: list[int] = []
    for i in np.argsort(-evidence):
        if len(chosen) == MIXTURE_SIZE or evidence[i] < evidence.max() - 12:
            break
        if all(_apart(optima, int(i), j) for j in chosen):
            chosen.append(int(i))
    weight = np.exp(0.7 * (evidence[chosen] - evidence.max()))
    covariance = INFLATION**2 * optima.covariance[chosen]
    return _Mixture(
        weight / weight.sum(), optima.z[chosen], np.asarray(np.linalg.cholesky(covariance))
    )


def _apart(optima: _Optima, i: int, j: int) -> bool:
    offset = optima.z[i] - optima.z[j]
    distance = offset @ np.linalg.solve(optima.covariance[j], offset)
    return bool(distance > 0.25 * len(offset) ** 0.5)


def _temper(
    problem: Problem, mixture: _Mixture, rng: np.random.Generator, progress: Progress
) -> Population:
    """Carry draws of the mixture to the posterior, level by level."""
    z = mixture.draw(MEMBERS, rng)
    start = mixture.log_density(z)
    likelihood = log_likelihood(problem, z)
    level, levels, accepted = 0.0, 0, []
    while level < 1.0:
        target = likelihood - 0.5 * np.sum(z**2, axis=1)
        rise = _next_rise(target - start, 1.0 - level)
        if levels == MOST_LEVELS:
            rise = 1.0 - level
        keep = _resample(rise * (target - start), rng)
        z, start, likelihood = z[keep], start[keep], likelihood[keep]
        level, levels = level + rise, levels + 1
        progress.step("drawing the ensemble", 0.5 + 0.5 * min(level, 1.0))
        for _ in range(MOVES_PER_LEVEL if level < 1.0 else 2 * MOVES_PER_LEVEL):
            z, start, likelihood, share = _move(problem, mixture, rng, level, z, start, likelihood)
            accepted.append(share)
    return Population(z, likelihood, float(likelihood.max()), levels, float(np.mean(accepted)))


def _move(
    problem: Problem,
    mixture: _Mixture,
    rng: np.random.Generator,
    level: float,
    z: Array,
    start: Array,
    likelihood: Array,
) -> tuple[Array, Array, Array, float]:
    """One Metropolis step of every member towards mixture^(1-level) posterior^level."""
    proposed = z + mixture.step(len(z), rng)
    new_start = mixture.log_density(proposed)
    new_likelihood = log_likelihood(problem, proposed)
    old = _tempered(level, z, start, likelihood)
    new = _tempered(level, proposed, new_start, new_likelihood)
    taken = np.log(rng.random(len(z))) < new - old
    return (
        np.where(taken[:, None], proposed, z),
        np.where(taken, new_start, start),
        np.where(taken, new_likelihood, likelihood),
        float(taken.mean()),
    )


def _tempered(level: float, z: Array, start: Array, likelihood: Array) -> Array:
    return np.asarray((1 - level) * start + level * (likelihood - 0.5 * np.sum(z**2, axis=1)))


def _next_rise(log_ratio: Array, most: float) -> float:
    """Largest rise of the level that keeps half the effective size, by bisection."""
    if _effective_share(most * log_ratio) >= KEPT_EFFECTIVE_SHARE:
        return most
    low, high = 0.0, most
    for _ in range(30):
        middle = 0.5 * (low + high)
        if _effective_share(middle * log_ratio) >= KEPT_EFFECTIVE_SHARE:
            low = middle
        else:
            high = middle
    return max(low, 1e-3)


def _effective_share(log_weight: Array) -> float:
    weight = np.exp(log_weight - log_weight.max())
    return float(weight.sum() ** 2 / np.sum(weight**2) / len(weight))


def _resample(log_weight: Array, rng: np.random.Generator) -> NDArray[np.intp]:
    """Systematic resampling."""
    weight = np.exp(log_weight - log_weight.max())
    edges = np.cumsum(weight / weight.sum())
    points = (np.arange(len(weight)) + rng.random()) / len(weight)
    return np.minimum(np.searchsorted(edges, points), len(weight) - 1)
