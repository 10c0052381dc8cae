"""Tap recordings simulated from known modes, with everything that is true of them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from tests.bench.accuracy.surroundings import Density, SteadyTone, noise, tones

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

FULL_SCALE = 1.0
_NEGLIGIBLE = 1e-9
_BLOCK = 512
_SURELY_CLIPPED = 3
_NEAR_BLOW_S = 0.4


@dataclass(frozen=True)
class TrueMode:
    frequency_hz: float
    """Undamped natural frequency."""
    damping_ratio: float

    @property
    def pole(self) -> complex:
        natural = 2 * np.pi * self.frequency_hz
        return natural * complex(-self.damping_ratio, np.sqrt(1 - self.damping_ratio**2))

    @property
    def bandwidth_hz(self) -> float:
        """Half-power bandwidth."""
        return 2 * self.damping_ratio * self.frequency_hz


@dataclass(frozen=True)
class Hit:
    """One blow as it is planned."""

    at_s: float
    strength: float
    contact_s: float
    second_of_double: bool = False


@dataclass(frozen=True)
class Scene:
    """Everything a recording is made from, before its gain is set."""

    rate_hz: float
    duration_s: float
    high_hz: float
    """Upper end of the reported range."""
    hits: tuple[Hit, ...]
    density: Density
    modes: tuple[TrueMode, ...] = ()
    energies_db: tuple[float, ...] = ()
    """Wanted energy of each mode over the noise density, all hits together."""
    phases: tuple[float, ...] = ()
    weights: Real = field(default_factory=lambda: np.zeros((0, 0)))
    """(hits, modes) how much each hit moves each mode, besides its strength."""
    tones: tuple[SteadyTone, ...] = ()
    mains_hz: float = 0.0
    above: tuple[TrueMode, ...] = ()
    """Modes above the reported range."""
    scatter: tuple[float, float] = (0.0, 0.0)
    """Relative standard deviation of frequency and damping from hit to hit."""
    thump: float = 0.0
    """Contact pulse the sensor feels itself, as a share of the strongest mode."""
    high_pass_hz: float = 0.0
    peak: float = 0.7
    """Highest sample as a share of full scale; above 1 the strongest hits clip."""
    bits: int = 0


@dataclass(frozen=True)
class TrueBlow:
    at_s: float
    double: bool
    clipped: bool
    usable: bool
    """Neither double nor touched by a rail."""
    start: int
    """First sample of the free decay."""
    end: int
    """One past the last sample before the next blow."""
    amplitudes: Complex
    """(modes,) complex amplitude of each mode at ``start``."""


@dataclass(frozen=True)
class Simulated:
    """A recording and its truth."""

    samples: Real
    rate_hz: float
    high_hz: float
    modes: tuple[TrueMode, ...]
    blows: tuple[TrueBlow, ...]
    density: Density
    tones: tuple[SteadyTone, ...]
    mains_hz: float
    scatter: tuple[float, float]
    background: tuple[int, int]
    """Samples before the first blow."""

    @property
    def usable(self) -> tuple[TrueBlow, ...]:
        return tuple(blow for blow in self.blows if blow.usable)


def simulate(scene: Scene, rng: np.random.Generator) -> Simulated:
    """The recording of a scene, its gain set, clipped and quantised as the scene asks."""
    count = round(scene.duration_s * scene.rate_hz)
    ringing, states = struck(scene, rng, count)
    steady = tones(scene.tones, count, scene.rate_hz)
    sound = ringing + steady + noise(rng, count, scene.rate_hz, scene.density)
    gain = scene.peak * FULL_SCALE / float(np.abs(sound).max())
    sound, density = sound * gain, scene.density.times(gain)
    samples = np.clip(sound, -FULL_SCALE, FULL_SCALE)
    if scene.bits:
        step = 2 * FULL_SCALE / 2**scene.bits
        samples = np.clip(np.round(samples / step) * step, -FULL_SCALE, FULL_SCALE - step)
        density = density.over(step**2 / 12 / (scene.rate_hz / 2))
    return Simulated(
        samples,
        scene.rate_hz,
        scene.high_hz,
        scene.modes,
        true_blows(scene, samples, states * gain),
        density,
        tuple(
            SteadyTone(t.frequency_hz, t.amplitude * gain, t.phase, t.wander) for t in scene.tones
        ),
        scene.mains_hz,
        scene.scatter,
        (0, max(round(scene.hits[0].at_s * scene.rate_hz) - 1, 0) if scene.hits else count),
    )


def struck(scene: Scene, rng: np.random.Generator, count: int) -> tuple[Real, Complex]:
    """(count,) response to all hits and the (hits, modes) complex amplitudes after each."""
    out = np.zeros(count)
    states = np.zeros((len(scene.hits), len(scene.modes)), complex)
    poles = scattered_poles(scene, rng)
    gains = mode_gains(scene, poles)
    for j in range(len(scene.modes)):
        for i, hit in enumerate(scene.hits):
            gain = gains[j] * scene.weights[i, j] * hit.strength
            states[i:, j] += ring(out, hit, poles[i, j], gain, scene, later=scene.hits[i:])
    strongest = float(np.abs(states).max(initial=0.0)) or 1.0
    for mode in scene.above:
        for hit in scene.hits:
            gain = strongest * hit.strength * rng.uniform(0.2, 1.0)
            ring(out, hit, mode.pole, gain, scene)
    for hit in scene.hits:
        push = half_sine(hit.contact_s, scene.rate_hz)
        first = round(hit.at_s * scene.rate_hz)
        room = min(len(push), count - first)
        out[first : first + room] += (
            scene.thump * strongest * hit.strength * push[:room] / push.max()
        )
    if scene.high_pass_hz:
        out, states = high_passed(out, states, poles, scene)
    return out, states


def scattered_poles(scene: Scene, rng: np.random.Generator) -> Complex:
    """(hits, modes) poles, each hit with its own where they scatter."""
    frequency, damping = scene.scatter
    out = np.empty((len(scene.hits), len(scene.modes)), complex)
    for j, mode in enumerate(scene.modes):
        for i in range(len(scene.hits)):
            moved = mode.frequency_hz * (1 + frequency * rng.standard_normal())
            damped = mode.damping_ratio * np.exp(damping * rng.standard_normal())
            out[i, j] = TrueMode(moved, damped).pole
    return out


def mode_gains(scene: Scene, poles: Complex) -> Complex:
    """(modes,) complex gains that give each mode its wanted energy over the noise density."""
    out = np.zeros(len(scene.modes), complex)
    for j, mode in enumerate(scene.modes):
        energy = 0.0
        for i, hit in enumerate(scene.hits):
            push = half_sine(hit.contact_s, scene.rate_hz)
            begin = abs(state_after(push, np.exp(poles[i, j] / scene.rate_hz)))
            share = begin * scene.weights[i, j] * hit.strength
            energy += share**2 / (-4 * poles[i, j].real)
        wanted = 10 ** (scene.energies_db[j] / 10) * float(scene.density.at(mode.frequency_hz)) / 2
        out[j] = np.sqrt(wanted / energy) * np.exp(1j * scene.phases[j])
    return out


def half_sine(contact_s: float, rate_hz: float) -> Real:
    """Contact force of unit impulse, at least one sample long."""
    count = max(round(contact_s * rate_hz), 1)
    force = np.sin(np.pi * (np.arange(count) + 0.5) / count)
    return np.asarray(force / force.sum())


def state_after(push: Real, z: complex) -> complex:
    """Complex amplitude of a mode one sample after a push."""
    return complex(np.sum(push * z ** np.arange(len(push), 0, -1)))


def ring(
    out: Real,
    hit: Hit,
    pole: complex,
    gain: complex,
    scene: Scene,
    later: Sequence[Hit] = (),
) -> Complex:
    """Add one mode's response to one hit; its amplitudes at the ends of later contacts."""
    rate_hz = scene.rate_hz
    z = np.exp(pole / rate_hz)
    push = half_sine(hit.contact_s, rate_hz)
    first = round(hit.at_s * rate_hz)
    free = first + len(push)
    during = np.convolve(push, z ** np.arange(len(push)))[: len(push)]
    out[first:free] += np.real(gain * during)[: len(out) - first]
    state = gain * state_after(push, z)
    length = max(min(int(np.log(_NEGLIGIBLE) / np.log(abs(z))) + 1, len(out) - free), 0)
    out[free : free + length] += np.real(state * powers(z, length))
    ends = [decay_start(h, rate_hz) - free for h in later]
    return np.array([state * z**n for n in ends])


def decay_start(hit: Hit, rate_hz: float) -> int:
    """First sample after the contact."""
    return round(hit.at_s * rate_hz) + max(round(hit.contact_s * rate_hz), 1)


def powers(z: complex, count: int) -> Complex:
    """(count,) z^0, z^1, ..., by blocks."""
    blocks = -(-count // _BLOCK)
    outer = z ** (_BLOCK * np.arange(blocks))
    return np.asarray((outer[:, None] * z ** np.arange(_BLOCK)).ravel()[:count])


def high_passed(
    signal: Real, states: Complex, poles: Complex, scene: Scene
) -> tuple[Real, Complex]:
    """Through the first-order high-pass of a microphone."""
    from scipy.signal import butter, lfilter

    b, a = butter(1, scene.high_pass_hz, "highpass", fs=scene.rate_hz)
    z = np.exp(poles / scene.rate_hz)
    gain = (b[0] + b[1] / z) / (a[0] + a[1] / z)
    return np.asarray(lfilter(b, a, signal)), states * gain


def true_blows(scene: Scene, samples: Real, states: Complex) -> tuple[TrueBlow, ...]:
    """The blows a user would count: a double is one."""
    out = []
    count = len(samples)
    hits = scene.hits
    for i, hit in enumerate(hits):
        if hit.second_of_double:
            continue
        double = i + 1 < len(hits) and hits[i + 1].second_of_double
        after = hits[i + (2 if double else 1) :]
        end = round(after[0].at_s * scene.rate_hz) if after else count
        first = round(hit.at_s * scene.rate_hz)
        near = samples[first : min(first + int(_NEAR_BLOW_S * scene.rate_hz), end)]
        rails = int(np.sum(np.abs(near) >= FULL_SCALE * (1 - 1e-4)))
        start = min(decay_start(hit, scene.rate_hz), end)
        usable = not double and rails == 0 and end - start >= 64
        out.append(
            TrueBlow(hit.at_s, double, rails >= _SURELY_CLIPPED, usable, start, end, states[i])
        )
    return tuple(out)
