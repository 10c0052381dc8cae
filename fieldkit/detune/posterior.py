"""From prior and likelihood to an ensemble: many starts, Laplace mixture, tempered population.

1. ``laplace`` finds the parameter sets worth knowing and a mixture of normals about them.
2. Draws of the mixture are carried to the exact posterior by annealed importance resampling
   (Neal 2001, Statistics and Computing 11, 125; Del Moral, Doucet and Jasra 2006, JRSS B 68, 411;
   both from memory), members moving by renewal within the mixture.
3. At the posterior every member moves on by steps that follow the curvature where it stands
   (Girolami and Calderhead 2011, JRSS B 73, 123, from memory), so that copies of one draw part.

How many independent draws that is worth is told from the family tree of the members: means over
families that descend from one draw each scatter the more, the fewer those are (Lee and Whiteley
2018, Biometrika 105, 609, from memory).
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.laplace import Mixture, about, mixture, proposal, shortened
from fieldkit.detune.problem import Local, Problem, Seen, alignments, expected, log_likelihood
from fieldkit.progress import Progress

__all__ = ["Population", "Problem", "Seen", "alignments", "log_likelihood", "sample"]

Array = NDArray[np.float64]
Index = NDArray[np.intp]

MEMBERS = 400
MOVES_PER_LEVEL = 2
RENEWED = (0.25, 0.6, 1.0)
"""How much of a member a move of the mixture draws anew."""
ELSEWHERE = 0.3
"""Share of the moves that try a draw of the whole mixture instead."""
LOCAL_MOVES = 4
STRIDES = (0.2, 0.5, 0.9)
"""The same for the moves along the local curvature."""
ATTEMPTS = 2
ENOUGH = 40.0
"""Effective size below which the normals are added to, about members found so far, and the draws
begun anew: the fewer, the more often a stated interval misses."""
LEARNT = 40
MOST_A_FAMILY = 12.0
"""Independent draws that one family may count for: its own moves cannot prove more."""
KEPT_EFFECTIVE_SHARE = 0.5
MOST_LEVELS = 12


@dataclass(frozen=True)
class Population:
    """Members drawn from the posterior, equally weighted."""

    z: Array
    """(members, parameters)."""
    log_likelihood: Array
    family: Index
    """(members,) which first draw each descends from."""
    levels: int
    acceptance: float
    """Share of the local moves that were taken."""

    @property
    def best_log_likelihood(self) -> float:
        """Of any member."""
        return float(self.log_likelihood.max())

    @property
    def effective_size(self) -> float:
        """How many independent draws would tell the parameters' means as well."""
        return effective_size(self.z, self.family)


def effective_size(values: Array, family: Index) -> float:
    """Independent draws that ``values`` (members, quantities) are worth, by families (members,)."""
    centred = values - values.mean(axis=0)
    spread = np.maximum(centred.std(axis=0), 1e-12)
    sums = np.zeros((int(family.max()) + 1, values.shape[1]))
    np.add.at(sums, family, centred / spread)
    variance = np.sum(sums**2, axis=0) / len(values) ** 2
    size = np.bincount(family)
    families = float(len(values) ** 2 / np.sum(size.astype(float) ** 2))
    most = min(float(len(values)), MOST_A_FAMILY * families)
    return float(min(most, 1 / max(float(np.mean(variance)), 1e-9)))


def sample(problem: Problem, rng: np.random.Generator, progress: Progress) -> Population:
    """Draw the posterior; deterministic for a given generator."""
    known = proposal(problem, rng, progress.within(0.0, 0.4))
    found: list[Population] = []
    for attempt in range(ATTEMPTS):
        start = 0.4 + 0.6 * attempt / ATTEMPTS
        work = progress.within(start, start + 0.6 / ATTEMPTS)
        tempered = _tempered(problem, mixture(known), rng, work.within(0.0, 0.6))
        found.append(_spread(problem, tempered, rng, work.within(0.6, 1.0)))
        if found[-1].effective_size >= ENOUGH:
            break
        typical = rng.choice(MEMBERS, LEARNT, replace=False)
        known = known.beside(about(problem, found[-1].z[typical]))
    return max(found, key=lambda population: population.effective_size)


@dataclass(frozen=True)
class _Members:
    """Members on their way from the mixture to the posterior."""

    z: Array
    log_likelihood: Array
    log_ratio: Array
    """Posterior over mixture."""
    family: Index

    def at(self, index: Index) -> _Members:
        """Some of them, or the same several times."""
        return _Members(
            self.z[index], self.log_likelihood[index], self.log_ratio[index], self.family[index]
        )


def _placed(problem: Problem, made: Mixture, z: Array, family: Index) -> _Members:
    likelihood = log_likelihood(problem, z)
    ratio = likelihood - 0.5 * np.sum(z**2, axis=1) - made.log_density(z)
    return _Members(z, likelihood, ratio, family)


def _tempered(
    problem: Problem, made: Mixture, rng: np.random.Generator, progress: Progress
) -> tuple[_Members, int]:
    """Carry draws of the mixture to the posterior, level by level."""
    progress.step("drawing the ensemble", 0.0)
    members = _placed(problem, made, made.draw(MEMBERS, rng), np.arange(MEMBERS))
    level, levels = 0.0, 0
    while level < 1.0:
        rise = _next_rise(members.log_ratio, 1.0 - level)
        if levels == MOST_LEVELS:
            rise = 1.0 - level
        members = members.at(_resample(rise * members.log_ratio, rng))
        level, levels = level + rise, levels + 1
        for _ in range(MOVES_PER_LEVEL):
            progress.step("drawing the ensemble", min(level, 1.0))
            members = _renew(problem, made, members, level, rng)
    return members, levels


def _renew(
    problem: Problem, made: Mixture, members: _Members, level: float, rng: np.random.Generator
) -> _Members:
    """One Metropolis step of every member towards mixture^(1-level) posterior^level."""
    share = rng.choice(RENEWED, size=len(members.z))
    elsewhere = rng.random(len(members.z)) < ELSEWHERE
    near = made.renewed(members.z, share, rng)
    z = np.where(elsewhere[:, None], made.draw(len(near), rng), near)
    tried = _placed(problem, made, z, members.family)
    rise = level * (tried.log_ratio - members.log_ratio)
    taken = np.log(rng.random(len(members.z))) < rise
    return _Members(
        np.where(taken[:, None], tried.z, members.z),
        np.where(taken, tried.log_likelihood, members.log_likelihood),
        np.where(taken, tried.log_ratio, members.log_ratio),
        members.family,
    )


@dataclass(frozen=True)
class _Stand:
    """Members with the normal that the curvature suggests about each."""

    z: Array
    log_posterior: Array
    log_likelihood: Array
    target: Array
    """(members, parameters) one Gauss-Newton step on."""
    root: Array
    """(members, parameters, parameters) lower Cholesky factor of the curvature."""

    def log_density(self, z: Array, stride: Array) -> Array:
        """Of stepping from here to z, up to a constant."""
        kept = np.sqrt(1 - stride**2)[:, None]
        offset = z - self.target - kept * (self.z - self.target)
        distance = np.sum((np.swapaxes(self.root, 1, 2) @ offset[:, :, None]) ** 2, axis=(1, 2))
        log_root = np.sum(np.log(np.diagonal(self.root, axis1=1, axis2=2)), axis=1)
        return np.asarray(log_root - 0.5 * distance / stride**2)

    def stepped(self, stride: Array, rng: np.random.Generator) -> Array:
        """A draw of that."""
        kept = np.sqrt(1 - stride**2)[:, None]
        white = rng.standard_normal((*self.z.shape, 1))
        noise = np.linalg.solve(np.swapaxes(self.root, 1, 2), white)[:, :, 0]
        return np.asarray(self.target + kept * (self.z - self.target) + stride[:, None] * noise)


def _stand(problem: Problem, z: Array) -> _Stand:
    local: Local = expected(problem, z)
    return _Stand(
        z,
        local.log_likelihood - 0.5 * np.sum(z**2, axis=1),
        local.log_likelihood,
        z + shortened(local.step),
        np.asarray(np.linalg.cholesky(local.curvature)),
    )


def _spread(
    problem: Problem,
    tempered: tuple[_Members, int],
    rng: np.random.Generator,
    progress: Progress,
) -> Population:
    """Metropolis-Hastings steps of every member along the local curvature."""
    members, levels = tempered
    progress.step("drawing the ensemble", 0.0)
    here = _stand(problem, members.z)
    accepted = []
    for i in range(LOCAL_MOVES):
        progress.step("drawing the ensemble", i / LOCAL_MOVES)
        stride = rng.choice(STRIDES, size=len(here.z))
        there = _stand(problem, here.stepped(stride, rng))
        rise = there.log_posterior - here.log_posterior
        rise += there.log_density(here.z, stride) - here.log_density(there.z, stride)
        taken = np.log(rng.random(len(here.z))) < rise
        here = _chosen(taken, there, here)
        accepted.append(float(taken.mean()))
    acceptance = float(np.mean(accepted))
    return Population(here.z, here.log_likelihood, members.family, levels, acceptance)


def _chosen(taken: NDArray[np.bool_], there: _Stand, here: _Stand) -> _Stand:
    def either(a: Array, b: Array) -> Array:
        return np.where(taken.reshape(-1, *[1] * (a.ndim - 1)), a, b)

    names = ("z", "log_posterior", "log_likelihood", "target", "root")
    return replace(here, **{n: either(getattr(there, n), getattr(here, n)) for n in names})


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


def _resample(log_weight: Array, rng: np.random.Generator) -> Index:
    """Systematic resampling."""
    weight = np.exp(log_weight - log_weight.max())
    edges = np.cumsum(weight / weight.sum())
    points = (np.arange(len(weight)) + rng.random()) / len(weight)
    return np.minimum(np.searchsorted(edges, points), len(weight) - 1)
