"""How likely each way of being installed is, given what was tapped before and after.

The evidence for a way is the mean likelihood of the re-tap over the ensemble of before and over
what that way leaves open. It is taken by importance sampling in two rounds: draws of the prior
tell where the second round has to look (population Monte Carlo: Cappé, Guillin, Marin and Robert
2004, J. Comput. Graph. Stat. 13, 907, from memory); half of that round still draws the prior.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.fixes import Change
from fieldkit.detune.match import Group, seen_by
from fieldkit.detune.problem import Problem, Seen, log_likelihood
from fieldkit.detune.recheck_joint import Joint, embedded, joint_of, lifted
from fieldkit.detune.recheck_spans import (
    OTHER,
    PRIOR,
    Held,
    Installed,
    installed,
    stations_of,
    ways,
)
from fieldkit.detune.reduced import ReducedModel, build
from fieldkit.detune.unknowns import Unknown, unknowns_of
from fieldkit.progress import Progress
from fieldkit.span.layout import Believed, Span, State

Array = NDArray[np.float64]

FIRST, SECOND = 600, 900
"""Draws of the two rounds."""
WIDER = 1.4
"""Standard deviation of the second round over that of the first one's weighted draws."""
LEAST_SD = 0.05
BEST = 20
"""The second round looks where so many of the best draws lie, where the weights name fewer."""


@dataclass(frozen=True)
class Known:
    """The span before the change and the members that agree with its taps."""

    span: Span
    """Pinned."""
    unknowns: tuple[Unknown, ...]
    z: Array
    """(members, unknowns)."""
    believed: Mapping[Held, Believed]


@dataclass(frozen=True)
class Way:
    """One way a change may stand, with the model of it in the state of the re-tap."""

    found: Installed
    joint: Joint
    model: ReducedModel
    """Reads joint values."""
    seen: tuple[Seen, ...]
    """The peaks of the re-tap."""

    @property
    def name(self) -> str:
        """Which way."""
        return self.found.name


@dataclass(frozen=True)
class Weighed:
    """A way held against the re-tap."""

    way: Way
    log_evidence: float
    z: Array
    """(draws, joint) of the second round."""
    weight: Array
    """(draws,) summing to 1."""


def ways_of(
    known: Known,
    change: Change,
    states: tuple[State, State, State],
    groups: Sequence[Group],
    up_to_hz: float,
    progress: Progress,
) -> tuple[Way, ...]:
    """Every way the change may stand; ``states`` are tapped, running and re-tapped."""
    names = ways(change)
    stations = stations_of(change, known.span)
    models: dict[Span, ReducedModel] = {}
    made = []
    for i, name in enumerate(names):
        progress.step("solving the span with the change", i / len(names))
        found = installed(known.span, change, name, known.believed)
        joint = joint_of(known.span, found, stations, states)
        after = joint.after_span
        if after not in models:
            models[after] = build(after, states[2], unknowns_of(after, states), up_to_hz)
        model = embedded(models[after], joint.after, joint)
        seen = tuple(seen_by(after, (model,), 0, group) for group in groups)
        made.append(Way(found, joint, model, seen))
    return tuple(made)


def drawn(known: Known, joint: Joint, count: int, rng: np.random.Generator) -> Array:
    """(count, joint) members of before with draws of what the change leaves open."""
    order = np.resize(rng.permutation(len(known.z)), count)
    fresh = rng.standard_normal((count, len(joint.unknowns)))
    return lifted(joint, known.span, known.unknowns, known.z[order], fresh)


def weighed(known: Known, way: Way, rng: np.random.Generator) -> Weighed:
    """The evidence for one way, and draws that stand for it."""
    problem = Problem((way.model,), way.seen)
    own = way.joint.own
    z = drawn(known, way.joint, FIRST if len(own) else SECOND, rng)
    likelihood = log_likelihood(problem, z)
    if not len(own):
        return _weighed(way, z, likelihood)
    centre, factor = _where(z[:, own], likelihood)
    z = drawn(known, way.joint, SECOND, rng)
    white = rng.standard_normal((SECOND // 2, len(own)))
    z[: SECOND // 2, own] = centre + white @ factor.T
    ratio = log_likelihood(problem, z) - _log_defence(z[:, own], centre, factor)
    return _weighed(way, z, ratio)


def _weighed(way: Way, z: Array, log_ratio: Array) -> Weighed:
    top = float(log_ratio.max())
    weight = np.exp(log_ratio - top)
    return Weighed(way, top + float(np.log(weight.mean())), z, weight / weight.sum())


def _where(own: Array, likelihood: Array) -> tuple[Array, Array]:
    """Centre and lower factor of the normal that the second round draws from."""
    threshold = np.sort(likelihood)[-BEST]
    power = np.minimum(likelihood, threshold) - threshold
    weight = np.exp(power) / np.exp(power).sum()
    centre = weight @ own
    offset = own - centre
    covariance = WIDER**2 * (offset.T * weight) @ offset + LEAST_SD**2 * np.eye(own.shape[1])
    return np.asarray(centre), np.asarray(np.linalg.cholesky(covariance))


def _log_defence(own: Array, centre: Array, factor: Array) -> Array:
    """(draws,) log of half proposal and half prior over the prior."""
    inside = np.linalg.solve(factor, (own - centre).T)
    log_volume = float(np.sum(np.log(np.diagonal(factor))))
    rise = 0.5 * np.sum(own**2, axis=1) - 0.5 * np.sum(inside**2, axis=0) - log_volume
    return np.asarray(np.logaddexp(rise, 0.0) - np.log(2.0))


def log_other(groups: Sequence[Group]) -> float:
    """Evidence that no peak is of this span: each may lie anywhere in the range."""
    each = [-g.peaks.weight * len(g.modes) * np.log(g.peaks.highest_hz) for g in groups]
    return float(np.sum(each))


def probabilities(found: Sequence[Weighed], groups: Sequence[Group]) -> dict[str, float]:
    """Posterior probability of each way, ``other`` among them, most likely first."""
    log = {w.way.name: float(np.log(PRIOR[w.way.name])) + w.log_evidence for w in found}
    log[OTHER] = float(np.log(PRIOR[OTHER])) + log_other(groups)
    top = max(log.values())
    share = {name: float(np.exp(value - top)) for name, value in log.items()}
    total = sum(share.values())
    ordered = sorted(share.items(), key=lambda item: -item[1])
    return {name: value / total for name, value in ordered}
