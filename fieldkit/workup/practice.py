"""A job's own span as a practice rig, with stiffnesses, masses and lengths that only it knows."""

from __future__ import annotations

import zlib
from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.capture.practice import RATE_HZ, Pace, PracticeSensor, PracticeSource
from fieldkit.capture.practice_plant import PracticeMachine, PracticePlant, plant_of
from fieldkit.capture.setup import FORCE, ChannelSetup
from fieldkit.detune.excitation import Excitation, bands
from fieldkit.detune.unknowns import Unknown, member_span, member_state, unknowns_of
from fieldkit.errors import InputError, Refusal
from fieldkit.job.document import Job
from fieldkit.quantity import parse
from fieldkit.span.layout import State
from fieldkit.span.modes import span_modes

_DRAWS = 40
_NEAREST, _FARTHEST = 0.5, 2.0
"""Unknowns lie within so many standard deviations of what the job expects, in the first draw and in
the last."""
_IN_TROUBLE = 0.05
"""A mode so near to an excitation, relative, is worth a cure."""
_UP_TO = 1.5
_LEAST_UP_TO_HZ = 150.0
_NEWTON = 40.0
_SENSITIVITY, _FULL_SCALE = "100 mV/g", "0.7 V"
_HAMMER = "10 kN per unit"
_TRUE_SENSITIVITY = 1.03
"""Of the rig's sensors, over what is written on them: a calibration finds out."""
_G = 9.80665
_WRITTEN = (1.0, 2.0, 2.5, 5.0, 10.0)
"""Round figures, times a power of ten, that are written on sensors: what a calibration found lies
near the one of the sensor it was done with, so that it is not calibrated into another."""
_SENSOR_AT, _STRUCK_AT = 0.42, 0.58
"""Shares of the span where nobody says."""
_DIRECTIONS = ("vertical", "lateral", "axial")


def practice_plant(job: Job, *, running: bool = False, seed: int | None = None) -> PracticePlant:
    """The span of a job as it might truly stand, the same at every call unless ``seed`` differs.

    Where the job names an excitation, it stands so that it runs into one, if it can. Raises Refusal
    where the span has no stable equilibrium.
    """
    seed = zlib.crc32(job.title.encode()) if seed is None else seed
    state = job.running if running else job.tapped
    unknowns = unknowns_of(job.span, (job.tapped, job.running))
    z = _hidden(job, unknowns, seed)
    span = member_span(job.span, unknowns, z)
    held: State = member_state(state, unknowns, z)
    return plant_of(
        span,
        held,
        name=job.title,
        up_to_hz=max(_UP_TO * job.goal.up_to_hz, _LEAST_UP_TO_HZ),
        seed=seed,
        machine=_machine(job.excitations),
    )


def practice_source(
    job: Job,
    channels: Sequence[ChannelSetup],
    *,
    running: bool = False,
    rate_hz: int | None = None,
    pace: Pace | None = None,
) -> PracticeSource:
    """A rig that streams what these channels of a job would hear.

    What a channel does not say is filled in as in ``practice_channels``, which raises InputError
    where it measures anything but acceleration.
    """
    plant = practice_plant(job, running=running)
    filled = practice_channels(job, channels)
    hammers = [setup.at_m for setup in filled if setup.quantity == FORCE]
    return PracticeSource(
        plant,
        [_sensor(setup) for setup in filled],
        rate_hz=rate_hz or RATE_HZ,
        struck_m=hammers[0] if hammers else _STRUCK_AT * _end(plant),
        pace=pace,
    )


def _hidden(job: Job, unknowns: Sequence[Unknown], seed: int) -> NDArray[np.float64]:
    """(unknowns,) the first draw that shakes, or the first of all; later ones lie farther out."""
    draws = np.random.default_rng(seed).uniform(-1, 1, (_DRAWS, len(unknowns)))
    draws *= np.linspace(_NEAREST, _FARTHEST, _DRAWS)[:, None]
    if not job.excitations:
        return np.asarray(draws[0])
    return next((z for z in draws if _shakes(job, unknowns, z)), np.asarray(draws[0]))


def _shakes(job: Job, unknowns: Sequence[Unknown], z: NDArray[np.float64]) -> bool:
    state = member_state(job.running, unknowns, z)
    try:
        modes = span_modes(member_span(job.span, unknowns, z), state, job.goal.up_to_hz)
    except Refusal:
        return False
    near = bands(job.excitations, _IN_TROUBLE)
    return any(band.holds(mode.frequency_hz) for band in near for mode in modes)


def _end(plant: PracticePlant) -> float:
    return float(plant.station_m[-1])


def practice_channels(job: Job, channels: Sequence[ChannelSetup]) -> tuple[ChannelSetup, ...]:
    """The channels with what nobody said filled in: place, direction and sensitivity.

    A hammer strikes beside the first sensor, so that the response tells effective masses.
    """
    sensors = [setup.at for setup in channels if setup.quantity != FORCE and setup.at]
    at = sensors[0] if sensors else f"{_SENSOR_AT * job.span.length_m:.2f} m"
    return tuple(
        _filled(setup, at, _DIRECTIONS[i % len(_DIRECTIONS)]) for i, setup in enumerate(channels)
    )


def _filled(setup: ChannelSetup, at: str, direction: str) -> ChannelSetup:
    if setup.quantity == FORCE:
        setup = replace(setup, at=setup.at or at)
        return setup if setup.si_per_unit is not None else replace(setup, scale=_HAMMER)
    setup = replace(setup, at=setup.at or at, direction=setup.direction or direction)
    if setup.quantity != "acceleration":
        raise InputError(
            f"the practice rig has no sensor for {setup.quantity}", "let it measure acceleration"
        )
    if setup.si_per_unit is not None:
        return setup
    return replace(setup, sensitivity=setup.sensitivity or _SENSITIVITY, full_scale=_FULL_SCALE)


def _sensor(setup: ChannelSetup) -> PracticeSensor:
    assert setup.si_per_unit is not None
    if setup.quantity == FORCE:
        return PracticeSensor(0.0, "vertical", setup.si_per_unit, hammer=True)
    assert setup.at_m is not None
    assert setup.direction is not None
    return PracticeSensor(setup.at_m, setup.direction, _true_full_scale(setup))


def _true_full_scale(setup: ChannelSetup) -> float:
    """Acceleration at which the input truly reads 1, whether or not that was calibrated before."""
    assert setup.si_per_unit is not None
    if setup.full_scale is None:
        return _written(setup.si_per_unit) / _TRUE_SENSITIVITY
    volts = parse(setup.full_scale, "voltage")
    volts_per_g = _written(volts / setup.si_per_unit * _G) * _TRUE_SENSITIVITY
    return volts / volts_per_g * _G


def _written(value: float) -> float:
    """The round figure that is nearest, in ratio."""
    decade = 10.0 ** np.floor(np.log10(value))
    return float(decade * min(_WRITTEN, key=lambda figure: abs(np.log(figure * decade / value))))


def _machine(excitations: Sequence[Excitation]) -> PracticeMachine | None:
    """The first machine with a speed, at the middle of its range, beside the start of the span."""
    for excitation in excitations:
        if excitation.speed_hz is not None:
            low, high = excitation.speed_hz
            newton = tuple((order, _NEWTON / (1 + i)) for i, order in enumerate(excitation.orders))
            return PracticeMachine(excitation.name, 30 * (low + high), newton, at_m=0.3)
    return None
