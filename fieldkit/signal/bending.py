"""A frequency that drifts with amplitude inside each decay: a support with play, a gap, friction.

With a frequency that departs from its small-amplitude value in proportion to the amplitude, and an
amplitude that decays exponentially, the phase runs ahead by ``b A (1 - exp(-s t))`` radians. Such
a decay looks like two or three modes side by side, or like poles that differ from tap to tap; one
number shared by all taps explains it instead.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.bands import cosines_sines, real_rows
from fieldkit.signal.clusters import surroundings
from fieldkit.signal.likelihood import Fit, Still, fit_before, inverse, less_part_in, orthonormal
from fieldkit.signal.powers import Powers
from fieldkit.signal.scan import Region
from fieldkit.signal.scatter import loosened, scattered
from fieldkit.signal.search import WANDER_REACH, Found, without
from fieldkit.signal.traces import Component, Trace, bent_weights, component

Real = NDArray[np.float64]

_STEPS = 20
_FEW_STEPS = 5
_MORE_TERMS = 3
"""Of the series than the amplitudes at its start ask for: they change with every fit."""
_HOPELESS = 4.0
_MOST_ROWS = 1500
"""Real data of one tap; wider bands hold other things than one mode."""
_STARTS_RAD = (-1.5, 1.5)
_LEAST_RAD = 0.2
_MOST_RAD = 8.0
_MOST_DAMPING = 0.3
_SURELY = 3.5
"""Standard deviations by which the drift must differ from none."""
_BESIDE = 1.5
_ENERGY_SHARE = 2 / 3
"""Amplitude, over that at the blow, where a decay has its centre of energy."""


@dataclass(frozen=True)
class Bent:
    """A mode whose frequency drifts with amplitude, and its fit."""

    part: Component
    fit: Fit
    drift_sd: float
    """Of the phase per unit amplitude."""


def with_drift(traces: Sequence[Trace], found: Found, region: Region) -> Found:
    """The search result with groups of components that one drifting mode explains better."""
    parts = list(found.parts)
    modes = [p for p in parts if may_drift(p, parts, region)]
    modes.sort(key=lambda p: -float(np.abs(p.amplitudes).max()))
    for part in modes:
        if not any(part is p for p in parts):
            continue
        group = [part, *(p for p in parts if is_beside(p, part, traces))]
        rest = without(parts, group)
        pairs = [pair for pair in found.unresolved if stands_for(part, pair)]
        instead = [component(pole, len(traces)) for pair in pairs[:1] for pole in pair]
        one = better_bent(traces, group, instead or group, rest, region)
        if one is not None:
            parts = [*rest, one.part]
    return replace(found, parts=tuple(parts))


def may_drift(part: Component, parts: Sequence[Component], region: Region) -> bool:
    """True for what looks like a mode, in the range that matters, not beside a steady line."""
    if part.steady or part.damping_ratio > _MOST_DAMPING or part.frequency_hz > region.slow_high_hz:
        return False
    reach_hz = WANDER_REACH * part.frequency_hz
    return not any(p.steady and abs(p.frequency_hz - part.frequency_hz) < reach_hz for p in parts)


def stands_for(part: Component, pair: tuple[complex, complex]) -> bool:
    """True for the component that stands for two unresolved ones."""
    nearest = min(abs(pole - part.pole) for pole in pair)
    return nearest < 2 * np.pi * part.half_power_hz


def is_beside(other: Component, part: Component, traces: Sequence[Trace]) -> bool:
    """True for a mode within a few bandwidths."""
    if other is part or other.steady or other.bend:
        return False
    width = part.half_power_hz + other.half_power_hz + 1 / max(t.duration_s for t in traces)
    return abs(other.frequency_hz - part.frequency_hz) < _BESIDE * width


def better_bent(
    traces: Sequence[Trace],
    group: Sequence[Component],
    rival: Sequence[Component],
    rest: Sequence[Component],
    region: Region,
) -> Bent | None:
    """One drifting mode in place of the group; None where the rival explains more for its price.

    The rival is the group, or the two modes one of it stands for. Bayesian information criterion.
    """
    still = surroundings(traces, group, rest, region.high_hz)
    if still.bins.rows > _MOST_ROWS * len(traces):
        return None
    if len(group) == 1 and not scattered(group[0]) and not promising(still, group[0]):
        return None
    cost, numbers = rival_cost(still, traces, rival, rest, region)
    saved = (numbers - 3 - 2 * len(traces)) * np.log(max(still.bins.rows, 2))
    starts = [bent_from(group[0], turn) for turn in _STARTS_RAD]
    tried = [bent_fit(still, start, steps=_FEW_STEPS) for start in starts]
    nearer = min(tried, key=lambda b: b.fit.cost)
    if nearer.fit.cost > _HOPELESS * (cost + saved):
        return None
    best = bent_fit(still, nearer.part)
    turn = abs(best.part.bend) * float(np.abs(best.part.amplitudes).max())
    sure = abs(best.part.bend) > _SURELY * best.drift_sd and turn > _LEAST_RAD
    noise = max(min(best.fit.variance, cost / max(still.bins.rows, 1)), 1.0)
    return best if sure and best.fit.cost < cost + saved * noise else None


def promising(still: Still, part: Component) -> bool:
    """True where letting the frequency of a lone mode drift would save enough, to first order."""
    point = BentPoint.at(still, part)
    normal = np.matmul(point.jacobian, point.jacobian.transpose(0, 2, 1)).sum(axis=0)
    slope = np.matmul(point.jacobian, point.residual[:, :, None]).sum(axis=0)[:, 0]
    saved = slope @ inverse(normal) @ slope - slope[:2] @ inverse(normal[:2, :2]) @ slope[:2]
    noise = max(point.cost / max(still.bins.rows, 1), 1.0)
    return bool(saved > 0.8 * _SURELY**2 * noise)


def rival_cost(
    still: Still,
    traces: Sequence[Trace],
    rival: Sequence[Component],
    rest: Sequence[Component],
    region: Region,
) -> tuple[float, int]:
    """Chi-squared of modes that do not drift, and how many numbers they take."""
    taps = len(traces)
    if any(scattered(p) for p in rival):
        return loosened(traces, rival, rest, region.high_hz, rival).cost, 4 * taps * len(rival)
    return fit_before(still, rival).cost, (2 + 2 * taps) * len(rival)


def bent_from(part: Component, turn_rad: float) -> Component:
    """The mode with a phase lead of so much in the strongest tap, about the same mean frequency."""
    bend = turn_rad / max(float(np.abs(part.amplitudes).max()), 1e-300)
    lead = _ENERGY_SHARE * turn_rad * part.decay_per_s
    return replace(part.with_pole(part.pole - 1j * lead), bend=bend)


def bent_fit(still: Still, part: Component, steps: int = _STEPS) -> Bent:
    """Frequency, decay and drift shared by the taps, amplitudes free: damped Gauss-Newton."""
    point, damping = BentPoint.at(still, part), 1e-2
    for _ in range(steps):
        trial = point.moved(still, damping)
        if trial.cost < point.cost:
            gain, point, damping = point.cost - trial.cost, trial, damping / 5
            if gain < 1e-3 * max(point.cost / max(still.bins.rows, 1), 1.0):
                break
        elif damping > 1e3:
            break
        else:
            damping *= 8
    return point.finished(still)


@dataclass(frozen=True)
class BentPoint:
    """The model of a drifting mode at one set of parameters."""

    part: Component
    cost: float
    residual: Real
    """(K, R)"""
    jacobian: Real
    """(K, 3, R) derivative by angular frequency, ln decay and ln-scaled drift, projected."""
    scale: float
    """Unit of the drift parameter."""

    @classmethod
    def at(cls, still: Still, part: Component) -> BentPoint:
        """Solve for the amplitudes; the drift uses their last sizes."""
        weights = bent_weights(part)
        powers = Powers.of(still.bins, part, len(weights) + _MORE_TERMS)
        for _ in range(2):
            rows = still.clear(real_rows(cosines_sines(powers.pair(weights))))
            basis, to_numbers = orthonormal(rows)
            shares = np.matmul(basis, still.left[:, :, None])
            numbers = np.matmul(to_numbers, shares)[:, :, 0]
            part = replace(part, amplitudes=numbers[:, 0] + 1j * numbers[:, 1])
            weights = bent_weights(part)
            powers = powers.enough(part, len(weights))
        left = still.left[:, None] - shares.transpose(0, 2, 1) @ basis
        scale = 1 / max(float(np.abs(part.amplitudes).max()), 1e-300)
        slopes = powers.slopes(part, weights, scale)
        tangent = less_part_in(basis, still.clear(real_rows(slopes)))
        return cls(part, float(np.sum(left**2)), left[:, 0], tangent, scale)

    def moved(self, still: Still, damping: float) -> BentPoint:
        """The point one damped Gauss-Newton step away."""
        normal = np.matmul(self.jacobian, self.jacobian.transpose(0, 2, 1)).sum(axis=0)
        slope = np.matmul(self.jacobian, self.residual[:, :, None]).sum(axis=0)[:, 0]
        move = np.linalg.solve(normal + np.diag((damping + 1e-12) * np.diag(normal) + 1e-30), slope)
        limit = np.array([3 * self.part.decay_per_s, 1.0, 2.0])
        return BentPoint.at(still, self.changed(still, np.clip(move, -limit, limit)))

    def changed(self, still: Still, move: Real) -> Component:
        """The mode with its parameters moved, held in the band."""
        trial = changed(self.part, move, self.scale)
        low, high = (2 * np.pi * edge for edge in still.bins.edges_hz)
        decay = min(trial.decay_per_s, _MOST_DAMPING * trial.pole.imag)
        omega = float(np.clip(trial.pole.imag, max(low, decay), high))
        return replace(trial.with_pole(complex(-decay, omega)), bend=trial.bend)

    def finished(self, still: Still) -> Bent:
        """The fit, its information on the pole with the drift left free."""
        by_tap = np.matmul(self.jacobian, self.jacobian.transpose(0, 2, 1))
        whole = by_tap.sum(axis=0)
        cross = whole[:2, 2:] @ whole[2:, :2] / max(whole[2, 2], 1e-300)
        fit = Fit(
            (self.part,),
            still.passive,
            self.cost,
            np.sum(self.residual**2, axis=1),
            still.bins.rows - len(by_tap) * (2 + still.rows.shape[1]) - 3,
            whole[:2, :2] - cross,
            by_tap[:, :2, :2],
            np.matmul(self.jacobian, self.residual[:, :, None])[:, :2, 0],
        )
        drift_sd = np.sqrt(inverse(whole)[2, 2] * max(fit.variance, 1.0)) * self.scale
        return Bent(self.part, fit, float(drift_sd))


def changed(part: Component, move: Real, scale: float) -> Component:
    """The component with its angular frequency, ln decay and drift moved."""
    decay = part.decay_per_s * np.exp(move[1])
    omega = part.pole.imag + move[0]
    most = _MOST_RAD * scale
    bend = float(np.clip(part.bend + move[2] * scale, -most, most))
    return replace(part.with_pole(complex(-decay, omega)), bend=bend)
