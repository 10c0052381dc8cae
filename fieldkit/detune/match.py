"""Fit the unknowns of a span to what was measured, as an ensemble."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune import posterior
from fieldkit.detune.evidence import RUNNING, Evidence
from fieldkit.detune.field import Field, field
from fieldkit.detune.matched import Ensemble, Match, Pair, ParameterReading
from fieldkit.detune.pairing import BELONGS, model_modes, next_measurement, pairs_of
from fieldkit.detune.peak_groups import SENSED_STATIONS, Group, grouped, running_weight, seen_by
from fieldkit.detune.posterior import Population, Problem
from fieldkit.detune.reduced import ReducedModel, build, same_mesh
from fieldkit.detune.unknowns import Unknown, unknowns_of
from fieldkit.errors import Refusal
from fieldkit.progress import Progress
from fieldkit.signal.modes import MeasuredMode
from fieldkit.span.layout import Span, State

__all__ = [
    "FEW_EFFECTIVE",
    "LEAST_EFFECTIVE",
    "SENSED_STATIONS",
    "Group",
    "grouped",
    "match",
    "model_modes",
    "next_measurement",
    "running_weight",
    "seen_by",
]

Array = NDArray[np.float64]

SEED = 7
INFORMED_SD = 0.75
"""A parameter counts as informed when the tap cut its doubt to this share of the prior."""
LEAST_EFFECTIVE = 4.0
FEW_EFFECTIVE = 30.0


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
    models = _models(span, states, unknowns, up_to_hz, progress)
    groups = grouped(evidence.modes, up_to_hz)
    number = {state.name: i for i, state in enumerate(states)}
    seen = tuple(seen_by(span, models, number[group.peaks.state], group) for group in groups)
    problem = Problem(models, seen, alike=same_mesh(models))
    sampling, reading_it = progress.within(0.1, 0.9), progress.within(0.9, 1.0)
    population = posterior.sample(problem, np.random.default_rng(SEED), sampling)
    reading = _Reading(span, models, groups, problem, population, reading_it)
    _require_plausible(reading)
    _require_enough(population)
    return _answer(reading, evidence, unknowns, handbook_hz)


def _models(
    span: Span,
    states: Sequence[State],
    unknowns: Sequence[Unknown],
    up_to_hz: float,
    progress: Progress,
) -> tuple[ReducedModel, ...]:
    models = []
    for i, state in enumerate(states):
        progress.step(f"setting up the model, {state.name}", 0.1 * i / len(states))
        models.append(build(span, state, unknowns, up_to_hz))
    return tuple(models)


@dataclass(frozen=True)
class _Reading:
    """The finished population with everything needed to read it."""

    span: Span
    models: tuple[ReducedModel, ...]
    groups: tuple[Group, ...]
    problem: Problem
    population: Population
    progress: Progress

    @cached_property
    def fields(self) -> dict[int, Field]:
        """The ensemble as seen as tapped, and in every other state something was measured in."""
        found = {}
        for i in sorted({0, *self.problem.used}):
            self.progress.step("reading the ensemble", 0.4)
            found[i] = field(self.span, self.models[i], self.population.z)
        return found

    @cached_property
    def belonging(self) -> list[Array]:
        """(members, peaks, modes) of each group."""
        self.progress.step("reading the ensemble", 0.0)
        found, _, _ = posterior.alignments(self.problem, self.population.z)
        return [alignment.responsibility for alignment in found]


def _require_plausible(reading: _Reading) -> None:
    """Refuse when most peaks belong to no computed mode for any member; taps decide, where any."""
    firm = [n for n, group in enumerate(reading.groups) if group.modes[0].source != RUNNING]
    numbers = firm or list(range(len(reading.groups)))
    explained = [
        float(share)
        for number in numbers
        for share in reading.belonging[number].sum(axis=2).mean(axis=0)
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
    seen = [reading.fields[group.model] for group in reading.problem.seen]
    reading.progress.step("pairing peaks with modes", 0.7)
    pairs, unpaired = pairs_of(reading.groups, seen, reading.belonging, handbook_hz)
    parameters = tuple(_parameter(unknown, z[:, i]) for i, unknown in enumerate(unknowns))
    reading.progress.step("reading the ensemble", 0.9)
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
