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
FIRST_DRAWS = 1600
"""The members are chosen from these: a draw costs one solve, a lost family a chain of them."""
MOVES_PER_LEVEL = 2
RENEWED = (0.25, 0.6, 1.0)
"""How much of a member a move of the mixture draws anew."""
ELSEWHERE = 0.3
"""Share of the moves that try a draw of the whole mixture instead."""
LOCAL_MOVES = 4
STRIDES = (0.2, 0.5, 0.9)
"""The same for the moves along the local curvature."""
ATTEMPTS = 3
ENOUGH = 60.0
"""Effective size below which the normals are added to, about members found so far, and further
members drawn: the fewer, the more often a stated interval misses."""
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
    log_evidence: float = 0.0
    """Logarithm of the evidence, as the resampling estimates it; of two pooled, their sum."""

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
    found: Population | None = None
    for attempt in range(ATTEMPTS):
        start = 0.4 + 0.6 * attempt / ATTEMPTS
        work = progress.within(start, start + 0.6 / ATTEMPTS)
        tempered = _tempered(problem, mixture(known), rng, work.within(0.0, 0.6))
        drawn = _spread(problem, tempered, rng, work.within(0.6, 1.0))
        found = drawn if found is None else pooled(found, drawn, rng)
        if found.effective_size >= ENOUGH:
            break
        typical = rng.choice(MEMBERS, LEARNT, replace=False)
        known = known.beside(about(problem, drawn.z[typical]))
    assert found is not None
    return found


def pooled(first: Population, second: Population, rng: np.random.Generator) -> Population:
    """Members of both, as many as one has, each population by its estimate of the evidence.

    The estimates of annealed resampling have no bias, so that weights by them have none either:
    a population that missed where most of the posterior lies counts little.
    """
    both = np.logaddexp(first.log_evidence, second.log_evidence)
    from_second = int(np.round(MEMBERS * np.exp(second.log_evidence - both)))
    kept = rng.permutation(MEMBERS)[: MEMBERS - from_second]
    added = rng.permutation(MEMBERS)[:from_second]
    return Population(
        np.concatenate([first.z[kept], second.z[added]]),
        np.concatenate([first.log_likelihood[kept], second.log_likelihood[added]]),
        np.concatenate([first.family[kept], second.family[added] + 1 + first.family.max()]),
        max(first.levels, second.levels),
        0.5 * (first.acceptance + second.acceptance),
        float(both),
    )


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


@dataclass(frozen=True)
class _Tempered:
    """Members at the posterior, and what it took."""

    members: _Members
    levels: int
    log_evidence: float


def _placed(problem: Problem, made: Mixture, z: Array, family: Index) -> _Members:
    likelihood = log_likelihood(problem, z)
    ratio = likelihood - 0.5 * np.sum(z**2, axis=1) - made.log_density(z)
    return _Members(z, likelihood, ratio, family)


def _tempered(
    problem: Problem, made: Mixture, rng: np.random.Generator, progress: Progress
) -> _Tempered:
    """Carry draws of the mixture to the posterior, level by level."""
    members = _first_draws(problem, made, rng, progress)
    level, levels, log_evidence = 0.0, 0, 0.0
    while level < 1.0:
        rise = _next_rise(members.log_ratio, 1.0 - level)
        if levels == MOST_LEVELS:
            rise = 1.0 - level
        weight = rise * members.log_ratio
        log_evidence += float(np.logaddexp.reduce(weight) - np.log(len(weight)))
        members = members.at(_resample(weight, MEMBERS, rng))
        level, levels = level + rise, levels + 1
        for _ in range(MOVES_PER_LEVEL):
            progress.step("drawing the ensemble", min(level, 1.0))
            members = _renew(problem, made, members, level, rng)
    return _Tempered(members, levels, log_evidence)


def _first_draws(
    problem: Problem, made: Mixture, rng: np.random.Generator, progress: Progress
) -> _Members:
    placed = []
    for first in range(0, FIRST_DRAWS, MEMBERS):
        progress.step("drawing the ensemble", 0.0)
        family = np.arange(first, first + MEMBERS)
        placed.append(_placed(problem, made, made.draw(MEMBERS, rng), family))
    return _Members(
        np.concatenate([p.z for p in placed]),
        np.concatenate([p.log_likelihood for p in placed]),
        np.concatenate([p.log_ratio for p in placed]),
        np.concatenate([p.family for p in placed]),
    )


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
    tempered: _Tempered,
    rng: np.random.Generator,
    progress: Progress,
) -> Population:
    """Metropolis-Hastings steps of every member along the local curvature."""
    members = tempered.members
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
    return Population(
        here.z,
        here.log_likelihood,
        members.family,
        tempered.levels,
        acceptance,
        tempered.log_evidence,
    )


def _chosen(taken: NDArray[np.bool_], there: _Stand, here: _Stand) -> _Stand:
    def either(a: Array, b: Array) -> Array:
        return np.where(taken.reshape(-1, *[1] * (a.ndim - 1)), a, b)

    names = ("z", "log_posterior", "log_likelihood", "target", "root")
    return replace(here, **{n: either(getattr(there, n), getattr(here, n)) for n in names})


def _next_rise(log_ratio: Array, most: float) -> float:
    """Largest rise of the level that leaves half as many effective members, by bisection."""
    wanted = KEPT_EFFECTIVE_SHARE * MEMBERS / len(log_ratio)
    if _effective_share(most * log_ratio) >= wanted:
        return most
    low, high = 0.0, most
    for _ in range(30):
        middle = 0.5 * (low + high)
        if _effective_share(middle * log_ratio) >= wanted:
            low = middle
        else:
            high = middle
    return max(low, 1e-3)


def _effective_share(log_weight: Array) -> float:
    weight = np.exp(log_weight - log_weight.max())
    return float(weight.sum() ** 2 / np.sum(weight**2) / len(weight))


def _resample(log_weight: Array, count: int, rng: np.random.Generator) -> Index:
    """Systematic resampling to ``count`` members."""
    weight = np.exp(log_weight - log_weight.max())
    edges = np.cumsum(weight / weight.sum())
    points = (np.arange(count) + rng.random()) / count
    return np.minimum(np.searchsorted(edges, points), len(weight) - 1)
