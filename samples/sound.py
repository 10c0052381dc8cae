"""What the accelerometer hears: taps and running noise by modal superposition.

Every mode is an exact discrete filter for a force that runs straight from sample to sample, so a
recording holds the true frequency and damping and no error of time stepping.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from pathlib import Path

import numpy as np
import soundfile
from frame import Modes
from numpy.typing import NDArray
from plants import Hit, Machine, RunningSession, TapSession
from route import axis_vectors, stretch_at
from scipy.signal import cont2discrete, firwin, lfilter

Array = NDArray[np.float64]
OVERSAMPLING_TO_HZ = 16000
"""Blows are computed at least this fast; a contact of a millisecond needs it."""
AMBIENT_CORNER_HZ = 300.0


def tap_signal(modes: Modes, damping: Array, session: TapSession) -> Array:
    """(n,) acceleration in m/s^2 as recorded, before the converter's rail and rounding."""
    rng = np.random.default_rng(session.seed)
    factor = max(1, math.ceil(OVERSAMPLING_TO_HZ / session.rate_hz))
    time = np.arange(int(session.length_s * session.rate_hz) * factor) / session.rate_hz / factor
    heard = modes.along(session.at_m, sensor_axis(modes, session))
    blows = [blow(time, hit) for hit in session.hits]
    fine, meant = np.zeros_like(time), np.sum(blows, axis=0)
    slanted = np.tensordot([hit.slant for hit in session.hits], blows, 1)
    for along, force in zip(hammer_axes(modes, session), (meant, slanted), strict=True):
        gain = modes.along(session.struck_m, along) * heard
        fine += modal_acceleration(modes.frequency_hz, damping, gain, force, time[1])
    clean = thinned(fine, factor)
    return clean + unwanted(len(clean), session, rng)


def running_signal(
    modes: Modes,
    damping: Array,
    session: RunningSession,
    machine: Machine,
    places_m: Iterable[float],
) -> Array:
    """(n, 2) vertical and lateral acceleration in m/s^2 of the machine and the flow."""
    rng = np.random.default_rng(session.seed)
    settle_s = 4.0
    count = int((session.length_s + settle_s) * session.rate_hz)
    step_s = 1 / session.rate_hz
    heard = [modes.along(session.at_m, axis) for axis in ("vertical", "lateral")]
    total = np.zeros((count, 2))
    for shaken, force in _running_forces(modes, session, machine, places_m, count, rng):
        for channel, at_sensor in enumerate(heard):
            gains = shaken * at_sensor
            total[:, channel] += modal_acceleration(
                modes.frequency_hz, damping, gains, force, step_s
            )
    noise = session.noise * math.sqrt(session.rate_hz / 2) * rng.standard_normal(total.shape)
    return (total + noise)[int(settle_s * session.rate_hz) :]


def blow(time: Array, hit: Hit) -> Array:
    """Half-sine force of a hit, in newtons, and of its bounce where it strikes again."""
    blows = [(hit.at_s, hit.newton)]
    if hit.again_after_s is not None:
        blows.append((hit.at_s + hit.again_after_s, 0.4 * hit.newton))
    force = np.zeros_like(time)
    for start, newton in blows:
        phase = (time - start) / hit.contact_s
        force += np.where((phase > 0) & (phase < 1), newton * np.sin(np.pi * phase), 0.0)
    return force


def modal_acceleration(
    frequency_hz: Array, damping: Array, gain: Array, force: Array, step_s: float
) -> Array:
    """(n,) sum over modes of gain times the acceleration of a unit modal mass under ``force``."""
    total = np.zeros_like(force)
    for f, zeta, g in zip(frequency_hz, damping, gain, strict=True):
        omega = 2 * math.pi * f
        system = (np.array([1.0, 0.0, 0.0]), np.array([1.0, 2 * zeta * omega, omega**2]))
        above, below, _ = cont2discrete(system, step_s, method="foh")
        total += g * lfilter(above.ravel(), below, force)
    return total


def sensor_axis(modes: Modes, session: TapSession) -> Array:
    """(3,) what the sensor feels: its axis, and a little of both axes across it."""
    direction = stretch_at(modes.frame.line, session.at_m).locate(session.at_m)[1]
    main = axis_vectors(direction, session.axis)[0]
    across = np.cross(direction, main)
    felt: Array = main + session.cross_axis * (across + 0.6 * direction)
    return felt


def hammer_axes(modes: Modes, session: TapSession) -> tuple[Array, Array]:
    """(3,) the direction that was meant, and the one across it and the pipe."""
    direction = stretch_at(modes.frame.line, session.struck_m).locate(session.struck_m)[1]
    main = axis_vectors(direction, session.axis)[0]
    return main, np.cross(direction, main)


def thinned(fine: Array, factor: int) -> Array:
    """Every ``factor``-th sample behind an anti-alias filter without delay."""
    if factor == 1:
        return fine
    taps = 32 * factor + 1
    low_pass = firwin(taps, 0.9 / factor)
    return np.convolve(fine, low_pass)[taps // 2 : taps // 2 + len(fine)][::factor]


def unwanted(count: int, session: TapSession, rng: np.random.Generator) -> Array:
    """(n,) sensor noise, what the plant around it does, mains hum, and a sensor that warms up."""
    time = np.arange(count) / session.rate_hz
    noise = session.noise * math.sqrt(session.rate_hz / 2) * rng.standard_normal(count)
    for frequency, amplitude in session.hum.items():
        noise += amplitude * np.sin(2 * math.pi * (frequency * time + rng.random()))
    white = session.ambient * math.sqrt(session.rate_hz / 2) * rng.standard_normal(count)
    keep = math.exp(-2 * math.pi * AMBIENT_CORNER_HZ / session.rate_hz)
    noise += lfilter([1 - keep], [1, -keep], white)
    quiet = max(session.noise, session.ambient)
    drift = 40 * quiet * np.exp(-time / 7.0) + 15 * quiet * np.sin(0.9 * time)
    return noise + drift


def noise_density(session: TapSession, frequency_hz: float) -> float:
    """One-sided power density of sensor noise and surroundings, (m/s^2)^2/Hz."""
    fall = 1 + (frequency_hz / AMBIENT_CORNER_HZ) ** 2
    return session.noise**2 + session.ambient**2 / fall


def write_flac(path: Path, acceleration: Array, rate_hz: int, bits: int, full_scale: float) -> None:
    """Round to ``bits`` and clip at full scale, as a converter does, and write."""
    top = 2 ** (bits - 1)
    counts = np.clip(np.round(acceleration / full_scale * top), -top, top - 1).astype(np.int64)
    if bits == 16:
        soundfile.write(path, counts.astype(np.int16), rate_hz, subtype="PCM_16")
    else:
        soundfile.write(path, (counts << 8).astype(np.int32), rate_hz, subtype="PCM_24")


def _running_forces(
    modes: Modes,
    session: RunningSession,
    machine: Machine,
    places_m: Iterable[float],
    count: int,
    rng: np.random.Generator,
) -> Iterable[tuple[Array, Array]]:
    """(shape where it acts (modes,), force (n,)) of the machine and of the flow at each place."""
    turns = _turns(machine, session.rate_hz, count, rng)
    orders = np.zeros(count)
    for order, newton in machine.force_n.items():
        orders += newton * np.sin(2 * math.pi * (order * turns + rng.random()))
    yield modes.along(machine.shakes_at_m, np.array(machine.shakes_along)), orders
    for place in places_m:
        across = rng.standard_normal(3)
        white = session.flow_n * math.sqrt(session.rate_hz / 2) * rng.standard_normal(count)
        fall = math.exp(-2 * math.pi * 60.0 / session.rate_hz)
        yield modes.along(place, across), lfilter([1 - fall], [1, -fall], white)


def _turns(machine: Machine, rate_hz: int, count: int, rng: np.random.Generator) -> Array:
    """Shaft angle in turns; the speed wanders by some 0.05 % over seconds."""
    keep = math.exp(-1 / (3.0 * rate_hz))
    wander = lfilter([math.sqrt(1 - keep**2)], [1, -keep], rng.standard_normal(count))
    speed = machine.rpm / 60 * (1 + 5e-4 * wander)
    return np.cumsum(np.clip(speed, machine.slowest_rpm / 60, machine.fastest_rpm / 60)) / rate_hz
