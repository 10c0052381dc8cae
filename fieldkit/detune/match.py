"""Fit the unknowns of a span to what was measured, as an ensemble."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune import posterior
from fieldkit.detune.evidence import RUNNING, Evidence
from fieldkit.detune.field import AXES, Field, field
from fieldkit.detune.likelihood import (
    DOUBTFUL_PEAK_RATE,
    FALSE_PEAK_RATE,
    MODEL_ERROR,
    RUNNING_DETECTION,
    RUNNING_FALSE_RATE,
    RUNNING_MODEL_ERROR,
    Peaks,
)
from fieldkit.detune.matched import Ensemble, Match, ModelMode, Pair, ParameterReading
from fieldkit.detune.posterior import Population, Problem, Seen
from fieldkit.detune.reduced import ReducedModel, build
from fieldkit.detune.tracking import follow, followed
from fieldkit.detune.unknowns import Unknown, unknowns_of
from fieldkit.errors import Refusal
from fieldkit.progress import Progress
from fieldkit.signal.modes import MeasuredMode
from fieldkit.span.layout import Span, State

Array = NDArray[np.float64]

SEED = 7
INFORMED_SD = 0.75
"""A parameter counts as informed when the tap cut its doubt to this share of the prior."""
BELONGS = 0.5
"""A peak is paired when it belongs to some mode with at least this probability."""
RUNNING_SHARE = 0.5
"""Running peaks weigh at most this share of as many peaks of taps (common practice, no source)."""
LEAST_EFFECTIVE = 4.0
FEW_EFFECTIVE = 15.0
FREE_HZ = 0.2
SENSED_STATIONS = 15
"""Places along the pipe that tell how much a mode moves at all."""
MOST_MODES = 12
FAINT = 0.02
HEAVY_DAMPING = 0.06
MARGIN_ABOVE_TYPED = 1.08
"""Typed-in peaks: nobody looked for modes higher than this times the highest one."""


def match(
    span: Span,
    tapped: State,
    running: State,
    evidence: Evidence,
    *,
    up_to_hz: float,
    handbook_hz: float | None = None,
    progress: Progress | None = None,
) -> Match:
    """Fit every unknown of the span to the measured modes.

    Raises Refusal when nothing was measured, or when no plausible parameter set explains it.
    """
    progress = progress or Progress()
    if not evidence.modes:
        raise Refusal(
            "no natural frequency was measured, so there is nothing to match the model to",
            "record a tap test, or type measured peaks into [[measured]]",
        )
    unknowns = unknowns_of(span, (tapped, running))
    states = (tapped, running)
    models = tuple(build(span, state, unknowns, up_to_hz) for state in states)
    groups = grouped(evidence.modes, up_to_hz)
    problem = Problem(models, tuple(_seen(span, models, states, group) for group in groups))
    population = posterior.sample(problem, np.random.default_rng(SEED), progress)
    reading = _Reading(span, tapped, running, models, groups, problem, population)
    _require_plausible(reading)
    _require_enough(population)
    return _answer(reading, evidence, unknowns, handbook_hz)


_Key = tuple[str, str | None, float | None, bool]
"""State, direction, station, and whether found while running."""


@dataclass(frozen=True)
class Group:
    """Measured modes of one state and direction."""

    modes: tuple[MeasuredMode, ...]
    peaks: Peaks


def grouped(modes: Sequence[MeasuredMode], up_to_hz: float) -> tuple[Group, ...]:
    """Peaks by state, direction, station and source, each in rising frequency."""
    weight = running_weight(modes)
    keys = dict.fromkeys(_group_key(m) for m in modes)
    groups = []
    for key in keys:
        own = sorted((m for m in modes if _group_key(m) == key), key=lambda m: m.frequency_hz)
        frequency = np.array([m.frequency_hz for m in own])
        running = own[0].source == RUNNING
        recorded = running or any(m.taps for m in own)
        highest = up_to_hz if recorded else MARGIN_ABOVE_TYPED * float(frequency.max())
        peaks = Peaks(
            frequency,
            np.array([max(m.frequency_sd_hz, 1e-4 * m.frequency_hz) for m in own]),
            own[0].direction,
            own[0].state,
            max(highest, 1.02 * float(frequency.max())),
            np.array([_false_rate(m) for m in own]),
            model_error=(RUNNING_MODEL_ERROR if running else MODEL_ERROR)
            * _places(keys, key) ** 0.5,
            shown=RUNNING_DETECTION if running else 1.0,
            weight=weight if running else 1.0,
        )
        groups.append(Group(tuple(own), peaks))
    return tuple(groups)


def _group_key(mode: MeasuredMode) -> _Key:
    return mode.state, mode.direction, mode.at_m, mode.source == RUNNING


def _places(keys: Iterable[_Key], key: _Key) -> int:
    """At how many stations the modes of a group were looked for in its direction.

    The model errs in a mode by the same amount wherever that mode is measured: peaks of one mode
    from several stations together must not say more of the model than one does.
    """
    state, direction, _, running = key
    return sum((k[0], k[1], k[3]) == (state, direction, running) for k in keys)


def running_weight(modes: Sequence[MeasuredMode]) -> float:
    """Weight of peaks found while running: all of them together stay below those of taps."""
    running = sum(m.source == RUNNING for m in modes)
    firm = len(modes) - running
    return min(1.0, RUNNING_SHARE * firm / running) if firm and running else 1.0


def _false_rate(mode: MeasuredMode) -> float:
    """How often such a peak belongs to no mode of the span."""
    usual = RUNNING_FALSE_RATE if mode.source == RUNNING else FALSE_PEAK_RATE
    return max(usual, DOUBTFUL_PEAK_RATE) if _doubtful(mode) else usual


def _doubtful(mode: MeasuredMode) -> bool:
    """Whether a peak is faint, or damped more than pipework at these amplitudes usually is."""
    return mode.strength < FAINT or (mode.damping_ratio or 0.0) > HEAVY_DAMPING


def _seen(
    span: Span, models: tuple[ReducedModel, ...], states: tuple[State, State], group: Group
) -> Seen:
    number = [state.name for state in states].index(group.peaks.state)
    model = models[number]
    stations = np.linspace(0, span.length_m, SENSED_STATIONS)
    at_m = group.modes[0].at_m
    axes = (group.peaks.direction,) if group.peaks.direction else ("vertical", "lateral", "axial")
    places = stations if at_m is None else np.array([at_m])
    return Seen(
        group.peaks,
        number,
        _motion(model, places, axes),
        _motion(model, stations, ("vertical", "lateral", "axial")),
    )


def _motion(model: ReducedModel, stations: Array, axes: Sequence[str]) -> Array:
    """(k, r) rows scaled so that their squares add up to the mean square over the stations."""
    rows = [
        model.structure.motion_rows(float(station), axis) for station in stations for axis in axes
    ]
    return np.asarray(np.concatenate(rows) @ model.basis / np.sqrt(len(stations)))


@dataclass(frozen=True)
class _Reading:
    """The finished population with everything needed to read it."""

    span: Span
    tapped: State
    running: State
    models: tuple[ReducedModel, ...]
    groups: tuple[Group, ...]
    problem: Problem
    population: Population

    @cached_property
    def fields(self) -> dict[int, Field]:
        """The ensemble as seen as tapped, and in every other state something was measured in."""
        return {
            i: field(self.span, self.models[i], self.population.z)
            for i in sorted({0, *self.problem.used})
        }

    def belonging(self, number: int) -> Array:
        """(members, peaks, modes) of one group."""
        found, _, _ = posterior.alignments(self.problem, self.population.z)
        return found[number].responsibility


def _require_plausible(reading: _Reading) -> None:
    """Refuse when most peaks belong to no computed mode for any member; taps decide, where any."""
    firm = [n for n, group in enumerate(reading.groups) if group.modes[0].source != RUNNING]
    numbers = firm or list(range(len(reading.groups)))
    explained = [
        float(share)
        for number in numbers
        for share in reading.belonging(number).sum(axis=2).mean(axis=0)
    ]
    if sum(share >= BELONGS for share in explained) >= max(1, (len(explained) + 1) // 2):
        return
    peaks = [m.frequency_hz for number in numbers for m in reading.groups[number].modes]
    lost = [f"{f:.1f}" for f, share in zip(peaks, explained, strict=True) if share < BELONGS]
    raise Refusal(
        "no plausible model of this span explains the measured frequencies "
        f"({', '.join(lost)} Hz belong to no computed mode)",
        "check the pipe size, the lengths, the state (full or empty) and that every support and "
        "heavy item between the ends is listed; then check whether the taps were on this pipe, or "
        "a support hangs loose",
    )


def _require_enough(population: Population) -> None:
    """Refuse where so few first draws survived that their spread says nothing."""
    size = population.effective_size
    if size < LEAST_EFFECTIVE:
        raise Refusal(
            "the measured frequencies can be explained in so many unlike ways that the ensemble "
            f"is worth {size:.0f} independent parameter sets only, too few to judge a change by",
            "state the supports that are known (vertical, lateral), leave out peaks that may "
            "belong to something else, or tap another place and direction",
        )


def _answer(
    reading: _Reading, evidence: Evidence, unknowns: tuple[Unknown, ...], handbook_hz: float | None
) -> Match:
    z = reading.population.z
    pairs, unpaired = _pairs(reading, handbook_hz)
    parameters = tuple(_parameter(unknown, z[:, i]) for i, unknown in enumerate(unknowns))
    modes = model_modes(reading.fields[0])
    return Match(
        measured=evidence.modes,
        pairs=pairs,
        unpaired=unpaired,
        parameters=parameters,
        ensemble=_ensemble(reading.population, unknowns),
        tapped_modes=modes,
        next_measurement=next_measurement(modes, pairs, evidence),
        warnings=_warnings(pairs, unpaired, parameters, reading.population),
    )


def _ensemble(population: Population, unknowns: Sequence[Unknown]) -> Ensemble:
    """Two halves, of different families where there are many: to choose by and to judge by."""
    order = np.argsort(population.family, kind="stable")
    chosen, fresh = np.array_split(population.z[order], 2)
    return Ensemble(
        tuple(unknown.name for unknown in unknowns),
        chosen,
        np.full(len(chosen), 1.0 / len(chosen)),
        fresh,
        population.effective_size,
    )


def _parameter(unknown: Unknown, z: Array) -> ParameterReading:
    prior = unknown.at(np.array([-1.6449, 0.0, 1.6449]))
    low, median, high = np.quantile(unknown.at(z), (0.05, 0.5, 0.95))
    return ParameterReading(
        unknown.name,
        unknown.unit,
        float(prior[1]),
        float(prior[0]),
        float(prior[2]),
        float(median),
        float(low),
        float(high),
        informed=bool(z.std() < INFORMED_SD),
    )


def _pairs(
    reading: _Reading, handbook_hz: float | None
) -> tuple[tuple[Pair, ...], tuple[MeasuredMode, ...]]:
    pairs: list[Pair] = []
    unpaired: list[MeasuredMode] = []
    for number, group in enumerate(reading.groups):
        seen = reading.fields[reading.problem.seen[number].model]
        belonging = reading.belonging(number)
        followed_modes = _Followed.of(seen, belonging.shape[2])
        share = followed_modes.probability(belonging)
        for i, measured in enumerate(group.modes):
            best = int(np.argmax(share[i]))
            if share[i, best] < BELONGS * share[i].sum() or share[i].sum() < BELONGS:
                unpaired.append(measured)
            else:
                pairs.append(followed_modes.pair(best, measured, handbook_hz))
    pairs.sort(key=lambda pair: pair.measured.frequency_hz)
    return tuple(pairs), tuple(unpaired)


@dataclass(frozen=True)
class _Followed:
    """Modes of one state followed through the ensemble."""

    frequency_hz: Array
    """(members, modes)."""
    chosen: NDArray[np.intp]
    prior_hz: Array
    direction: tuple[str, ...]

    @classmethod
    def of(cls, seen: Field, count: int) -> _Followed:
        frequency, share = seen.modes.frequency_hz, seen.direction_share(seen.modes.vector)
        reference = frequency[seen.central, :count], share[seen.central, :count]
        chosen = follow(frequency, share, *reference)
        prior = seen.model.modes(np.zeros((1, seen.z.shape[1])))
        prior_share = seen.direction_share(prior.vector)
        prior_chosen = follow(prior.frequency_hz, prior_share, *reference)
        return cls(
            followed(frequency, chosen),
            chosen,
            followed(prior.frequency_hz, prior_chosen)[0],
            tuple(AXES[i] for i in np.argmax(reference[1], axis=1)),
        )

    def probability(self, belonging: Array) -> Array:
        """(peaks, modes) that a peak belongs to a followed mode."""
        _, peaks, modes = belonging.shape
        inside = self.chosen < modes
        index = np.minimum(self.chosen, modes - 1)[:, None, :].repeat(peaks, axis=1)
        taken = np.take_along_axis(belonging, index, axis=2)
        return np.asarray((taken * inside[:, None, :]).mean(axis=0))

    def pair(self, j: int, measured: MeasuredMode, handbook_hz: float | None) -> Pair:
        low, median, high = np.quantile(self.frequency_hz[:, j], (0.05, 0.5, 0.95))
        vibrating = int(np.sum(np.median(self.frequency_hz, axis=0)[:j] > FREE_HZ))
        return Pair(
            vibrating + 1,
            measured,
            float(self.prior_hz[j]),
            float(median),
            float(low),
            float(high),
            self.direction[j],
            handbook_hz if vibrating == 0 else None,
        )


def model_modes(seen: Field) -> tuple[ModelMode, ...]:
    """Modes of the ensemble with their intervals, direction and where they move most."""
    frequency, share = seen.modes.frequency_hz, seen.direction_share(seen.modes.vector)
    count = min(frequency.shape[1], MOST_MODES)
    reference = frequency[seen.central, :count], share[seen.central, :count]
    tracked = followed(frequency, follow(frequency, share, *reference))
    found = []
    for j in range(count):
        low, median, high = np.quantile(tracked[:, j], (0.05, 0.5, 0.95))
        if median > FREE_HZ:
            where = seen.largest_at(seen.central, j)
            direction = AXES[int(np.argmax(reference[1][j]))]
            found.append(ModelMode(float(median), float(low), float(high), direction, where))
    return tuple(sorted(found, key=lambda mode: mode.median_hz))


def next_measurement(modes: Sequence[ModelMode], pairs: Sequence[Pair], evidence: Evidence) -> str:
    """Which further blow would narrow the answer most, from the spread of what was not seen."""
    seen = {round(pair.model_hz, 6) for pair in pairs}
    highest = 1.2 * max(m.frequency_hz for m in evidence.modes)
    unseen = [m for m in modes if round(m.median_hz, 6) not in seen and m.median_hz < highest]
    if not unseen:
        return (
            "every computed mode in the range was seen; a further tap would add little, unless the "
            "span can be tapped in its running state (full and warm)"
        )
    widest = max(unseen, key=lambda mode: (mode.high_hz - mode.low_hz) / mode.median_hz)
    return (
        f"tap in {widest.direction} direction near {widest.where_m:.2f} m with the sensor beside "
        f"it: the {widest.direction} mode expected between {widest.low_hz:.1f} and "
        f"{widest.high_hz:.1f} Hz was not seen, and it is the least certain one"
    )


def _warnings(
    pairs: Sequence[Pair],
    unpaired: Sequence[MeasuredMode],
    parameters: Sequence[ParameterReading],
    population: Population,
) -> tuple[str, ...]:
    found = [
        f"the peak at {mode.frequency_hz:.2f} Hz belongs to no computed mode: another line, a "
        "loose part, the wall itself or the contents may ring there; check before relying on it"
        for mode in unpaired
        if mode.source != RUNNING
    ]
    if pairs and all(pair.measured.source == RUNNING for pair in pairs):
        found.append(
            "nothing was tapped: the match rests on running vibration alone, whose peaks may "
            "belong to a neighbour or to the flow; tap the pipe before anything is built on it"
        )
    if len(pairs) == 1:
        found.append(
            "one measured mode fixes one unknown only; a second one, best in the other direction, "
            "narrows the prediction more than anything else"
        )
    if population.effective_size < FEW_EFFECTIVE:
        found.append(
            "the measured frequencies can be explained in many unlike ways: the ensemble is worth "
            f"about {population.effective_size:.0f} independent parameter sets, so its chances are "
            "rough; a further tap would settle which"
        )
    far = np.abs(population.z.mean(axis=0)) > 2.5
    for parameter, is_far in zip(parameters, far, strict=True):
        if is_far:
            found.append(
                f"{parameter.name} had to go far from what is usual ({parameter.median:.3g} "
                f"{parameter.unit}): check how it is really built"
            )
    return tuple(found)
