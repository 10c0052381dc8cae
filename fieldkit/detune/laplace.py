"""Where the posterior lies: optima from many starts, and the mixture of normals about them.

Gauss-Newton on the expected alignment (an EM iteration: Dempster, Laird and Rubin 1977) from many
prior draws, the peak widths annealed, finds the parameter sets worth knowing. Their Laplace
approximations, weighted by evidence, make a mixture to draw from. Where draws show that it misses
something (a draw that weighs far more than its fellows), normals about those draws are added
(population Monte Carlo: Cappé, Guillin, Marin and Robert 2004, J. Comput. Graph. Stat. 13, 907,
from memory): a ridge of parameter sets that trade one support for another has no one normal.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.problem import Local, Problem, expected, log_likelihood
from fieldkit.progress import Progress

Array = NDArray[np.float64]

STARTS = 128
ANNEALING = (8.0, 5.0, 3.0, 2.0, 1.5, 1.0, 1.0, 1.0, 1.0, 1.0)
LONGEST_STEP = 1.5
MIXTURE_SIZE = 24
INFLATION = 1.3
"""Of the standard deviation in a direction that the peaks speak of; where they are silent the
posterior is the prior, and widening it would only spoil the draws."""
TEMPERED_EVIDENCE = 0.7
"""Power of the evidence as a weight: the smaller components must not starve."""
ROUNDS = 6
DRAWS = 250
ADDED = 12
CLIMBS = 3
GOOD_SHARE = 0.3
"""Effective share of the draws at which the mixture is good enough."""
LEAST_WEIGHT = 0.01
"""Of a component, against the best."""
LEAST_EVIDENCE = 12.0
"""Components this much (natural logarithm) below the best are left out."""


@dataclass(frozen=True)
class Normals:
    """Normal approximations of parts of the posterior."""

    centre: Array
    covariance: Array
    evidence: Array
    """(normals,) log of the mass each stands for, up to a constant."""

    def some(self, index: Sequence[int]) -> Normals:
        """A choice of them."""
        return Normals(self.centre[index], self.covariance[index], self.evidence[index])

    def beside(self, other: Normals) -> Normals:
        """Both together."""
        pairs = (
            (getattr(self, n), getattr(other, n)) for n in ("centre", "covariance", "evidence")
        )
        return Normals(*(np.concatenate(pair) for pair in pairs))


@dataclass(frozen=True)
class Mixture:
    """A mixture of normals."""

    weight: Array
    centre: Array
    factor: Array
    """(components, parameters, parameters) lower Cholesky factor."""

    def draw(self, count: int, rng: np.random.Generator) -> Array:
        """(count, parameters) independent draws."""
        which = rng.choice(len(self.weight), size=count, p=self.weight)
        noise = rng.standard_normal((count, self.centre.shape[1], 1))
        return np.asarray(self.centre[which] + (self.factor[which] @ noise)[:, :, 0])

    def log_each(self, z: Array) -> Array:
        """(members, components) log of weight times density."""
        inverse = np.linalg.inv(self.factor)
        offset = z.T[None] - self.centre[:, :, None]
        distance = np.sum((inverse @ offset) ** 2, axis=1).T
        log_volume = np.sum(np.log(np.diagonal(self.factor, axis1=1, axis2=2)), axis=1)
        constant = 0.5 * z.shape[1] * np.log(2 * np.pi)
        return np.asarray(np.log(self.weight) - log_volume - constant - 0.5 * distance)

    def log_density(self, z: Array) -> Array:
        """(members,)."""
        return np.asarray(np.logaddexp.reduce(self.log_each(z), axis=1))

    def renewed(self, z: Array, share: Array, rng: np.random.Generator) -> Array:
        """Each member partly drawn anew from the component it belongs to; leaves the mixture as is.

        ``share`` (members,) is 0 for no change and 1 for a new draw (preconditioned Crank-Nicolson
        step: Cotter, Roberts, Stuart and White 2013, Statistical Science 28, 424, from memory).
        """
        each = self.log_each(z)
        which = np.argmax(each + rng.gumbel(size=each.shape), axis=1)
        kept = np.sqrt(1 - share**2)[:, None]
        noise = (self.factor[which] @ rng.standard_normal((*z.shape, 1)))[:, :, 0]
        centre = self.centre[which]
        return np.asarray(centre + kept * (z - centre) + share[:, None] * noise)


def proposal(problem: Problem, rng: np.random.Generator, progress: Progress) -> Normals:
    """Normals that cover the posterior as well as a few rounds of looking allow."""
    starts = rng.standard_normal((STARTS, problem.parameters))
    known = _distinct(optima(problem, starts, progress.within(0.0, 0.6)))
    made = mixture(known)
    for i in range(ROUNDS):
        progress.step("drawing the ensemble", 0.6 + 0.4 * i / ROUNDS)
        z = made.draw(DRAWS, rng)
        ratio = log_likelihood(problem, z) - 0.5 * np.sum(z**2, axis=1) - made.log_density(z)
        weight = np.exp(ratio - ratio.max())
        if weight.sum() ** 2 / np.sum(weight**2) > GOOD_SHARE * DRAWS:
            break
        heavy = np.argsort(-weight)[:ADDED]
        known = known.beside(about(problem, z[heavy]))
        made = mixture(known)
    return known


def about(problem: Problem, z: Array) -> Normals:
    """Normals that fit the posterior at some parameter sets, and a little further up from each."""
    found = []
    for _ in range(CLIMBS):
        local = expected(problem, z)
        found.append(_normals(z, local))
        z = z + shortened(local.step)
    return found[0].beside(found[-1])


def _normals(z: Array, local: Local) -> Normals:
    """As if the frequencies were linear in the parameters from here on."""
    covariance = np.linalg.inv(local.curvature)
    _, log_volume = np.linalg.slogdet(covariance)
    value = local.log_likelihood - 0.5 * np.sum(z**2, axis=1)
    top = value + 0.5 * np.sum(local.step * local.gradient, axis=1)
    return Normals(
        z + shortened(local.step), np.asarray(covariance), np.asarray(top + 0.5 * log_volume)
    )


def optima(problem: Problem, z: Array, progress: Progress) -> Normals:
    """Gauss-Newton on the expected alignment, every start (starts, parameters) at once."""
    best = z
    best_value = np.full(len(z), -np.inf)
    for i, widening in enumerate(ANNEALING):
        progress.step("searching parameter sets that explain the tap", i / len(ANNEALING))
        local = expected(problem, z, widening)
        if widening == 1.0:
            value = local.log_likelihood - 0.5 * np.sum(z**2, axis=1)
            better = value > best_value
            best = np.where(better[:, None], z, best)
            best_value = np.where(better, value, best_value)
        z = z + shortened(local.step)
    return _normals(best, expected(problem, best))


def shortened(step: Array) -> Array:
    """Steps (members, parameters) no longer than LONGEST_STEP."""
    length = np.linalg.norm(step, axis=1, keepdims=True)
    return np.asarray(step * np.minimum(1.0, LONGEST_STEP / np.maximum(length, 1e-12)))


def mixture(normals: Normals) -> Mixture:
    """Normals weighted by evidence."""
    weight = np.exp(TEMPERED_EVIDENCE * (normals.evidence - normals.evidence.max()))
    weight = np.maximum(weight, LEAST_WEIGHT)
    factor = np.linalg.cholesky(_inflated(normals.covariance))
    return Mixture(weight / weight.sum(), normals.centre, np.asarray(factor))


def _distinct(normals: Normals) -> Normals:
    """Unlike each other, best first."""
    best = normals.evidence.max()
    chosen: list[int] = []
    for i in np.argsort(-normals.evidence):
        if len(chosen) == MIXTURE_SIZE or normals.evidence[i] < best - LEAST_EVIDENCE:
            break
        if all(_apart(normals, int(i), j) for j in chosen):
            chosen.append(int(i))
    return normals.some(chosen)


def _inflated(covariance: Array) -> Array:
    """Covariances (normals, n, n) widened in the directions that are narrower than the prior."""
    variance, axes = np.linalg.eigh(covariance)
    silent = np.clip(variance, 0.0, 1.0)
    wider = variance * (INFLATION**2 * (1 - silent) + silent)
    return np.asarray((axes * wider[:, None, :]) @ np.swapaxes(axes, 1, 2))


def _apart(normals: Normals, i: int, j: int) -> bool:
    offset = normals.centre[i] - normals.centre[j]
    distance = offset @ np.linalg.solve(normals.covariance[j], offset)
    return bool(distance > 0.25 * len(offset) ** 0.5)
