"""Kinds of tap recordings people bring, each drawn at random from a generator."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from zlib import crc32

import numpy as np

from tests.bench.accuracy import drawing
from tests.bench.accuracy.drawing import Rng, log_uniform
from tests.bench.accuracy.recordings import Hit, Scene, Simulated, TrueMode, simulate
from tests.bench.accuracy.surroundings import Density

Kind = Callable[[Rng], Scene]

_SLOWEST_SHAFT_HZ = 5.0


def quiet(rng: Rng) -> Scene:
    """A few modes, strong taps, little noise."""
    return plain(rng, int(rng.integers(2, 6)), (48, 78))


def noisy(rng: Rng) -> Scene:
    """A few modes not far over the noise."""
    return plain(rng, int(rng.integers(1, 4)), (27, 44))


def plain(
    rng: Rng,
    count: int,
    energies_db: tuple[float, float],
    taps: int = 0,
    density: Density | None = None,
    **more: object,
) -> Scene:
    """Modes well apart, taps that ring out."""
    rate_hz = drawing.rate(rng)
    high_hz = drawing.top(rng, rate_hz)
    modes = drawing.apart(rng, count, high_hz)
    return struck(rng, modes, rate_hz, high_hz, energies_db, taps, density, **more)


def struck(
    rng: Rng,
    modes: list[TrueMode],
    rate_hz: float,
    high_hz: float,
    energies_db: tuple[float, float],
    taps: int = 0,
    density: Density | None = None,
    **more: object,
) -> Scene:
    """These modes, tapped three to six times unless said."""
    taps = taps or int(rng.integers(3, 7))
    contact_s = drawing.contact(rng, modes)
    blows = drawing.hits(rng, taps, drawing.spacing(modes), contact_s)
    return drawing.scene(
        rng,
        modes,
        rate_hz=rate_hz,
        high_hz=high_hz,
        blows=blows,
        energies_db=energies_db,
        density=density,
        **more,
    )


def beside(rng: Rng, mode: TrueMode, apart: tuple[float, float]) -> TrueMode:
    """A mode so many half-power bandwidths above another."""
    shift = rng.uniform(*apart) * mode.bandwidth_hz
    return TrueMode(mode.frequency_hz + shift, mode.damping_ratio * rng.uniform(0.7, 1.4))


def directions(rng: Rng, taps: int, close: int, others: int) -> np.ndarray:
    """Weights of blows that point a little differently: close modes are moved unevenly."""
    angle = rng.uniform(0.5, 1.1) + rng.uniform(-0.45, 0.45, (taps, 1))
    planes = np.hstack([np.cos(angle), np.sin(angle), np.cos(angle + 0.8)])[:, :close]
    return np.hstack([np.clip(np.abs(planes), 0.1, None), drawing.weights(rng, taps, others)])


def pair(rng: Rng) -> Scene:
    """Two modes half to two bandwidths apart, and one elsewhere."""
    return crowd(rng, 2, (0.5, 2.0), (42, 70))


def triple(rng: Rng) -> Scene:
    """Three modes one to two and a half bandwidths apart."""
    return crowd(rng, 3, (1.0, 2.5), (52, 78))


def crowd(rng: Rng, close: int, apart: tuple[float, float], energies: tuple[float, float]) -> Scene:
    rate_hz = drawing.rate(rng)
    high_hz = drawing.top(rng, rate_hz)
    modes = [drawing.damped(rng, log_uniform(rng, 5.0, 0.7 * high_hz), 0.004, 0.03)]
    while len(modes) < close:
        modes.append(beside(rng, modes[-1], apart))
    other = drawing.damped(rng, log_uniform(rng, 3.0, 0.85 * high_hz))
    modes += [other] if all(drawing.clear(other, mode) for mode in modes) else []
    taps = int(rng.integers(3, 7))
    pointed = directions(rng, taps, close, len(modes) - close)
    return struck(rng, modes, rate_hz, high_hz, energies, taps, weights=pointed)


def hum(rng: Rng) -> Scene:
    """Mains hum at several multiples, one of them within two bandwidths of a mode."""
    line_hz = float(rng.choice([50.0, 60.0])) * (1 + 3e-4 * rng.standard_normal())
    rate_hz = drawing.rate(rng)
    high_hz = max(drawing.top(rng, rate_hz), 150.0)
    order = int(rng.integers(1, int(0.85 * high_hz / line_hz) + 1))
    damping = log_uniform(rng, 0.004, 0.02)
    shift = rng.uniform(-2, 2) * 2 * damping * order * line_hz
    modes = [TrueMode(order * line_hz + shift, damping)]
    other = drawing.damped(rng, log_uniform(rng, 3.0, 0.85 * high_hz))
    modes += [other] if drawing.clear(other, modes[0]) else []
    made = struck(rng, modes, rate_hz, high_hz, (42, 70))
    amplitude = drawing.amplitude_over(made.density, line_hz, rng.uniform(25, 62))
    return replace(made, tones=drawing.mains(rng, line_hz, amplitude), mains_hz=line_hz)


def running_machine(rng: Rng) -> Scene:
    """Several orders of a machine that wanders slightly, one near a mode."""
    made = plain(rng, int(rng.integers(2, 4)), (44, 70))
    near = made.modes[int(rng.integers(len(made.modes)))]
    side = float(rng.choice([-1.0, 1.0])) * rng.uniform(1.0, 4.0)
    line_hz = max(near.frequency_hz + side * near.bandwidth_hz, 0.8 * near.frequency_hz)
    shaft_hz = line_hz / min(int(rng.integers(1, 4)), max(int(line_hz / _SLOWEST_SHAFT_HZ), 1))
    amplitude = drawing.amplitude_over(made.density, line_hz, rng.uniform(25, 50))
    orders = sorted({*range(1, 5), *(int(o) for o in rng.integers(5, 12, 2))})
    wander = log_uniform(rng, 1e-4, 1e-3)
    return replace(made, tones=drawing.machine(rng, shaft_hz, orders, amplitude, wander))


def heavy(rng: Rng) -> Scene:
    """A rubbery line that rings for about two cycles."""
    rate_hz = drawing.rate(rng)
    high_hz = drawing.top(rng, rate_hz)
    modes = [TrueMode(log_uniform(rng, 5.0, 0.3 * high_hz), rng.uniform(0.05, 0.12))]
    if rng.random() < 0.5:
        higher_hz = modes[0].frequency_hz * rng.uniform(2.0, 3.0)
        modes.append(TrueMode(higher_hz, rng.uniform(0.05, 0.1)))
    return struck(rng, modes, rate_hz, high_hz, (36, 60))


def chime(rng: Rng) -> Scene:
    """Modes so little damped that they ring for ten seconds and more."""
    rate_hz = drawing.rate(rng)
    high_hz = max(drawing.top(rng, rate_hz), 200.0)
    modes = drawing.apart(rng, int(rng.integers(1, 4)), high_hz, 40.0)
    modes = [TrueMode(m.frequency_hz, log_uniform(rng, 2e-4, 1e-3)) for m in modes]
    contact_s = drawing.contact(rng, modes)
    blows = drawing.hits(rng, int(rng.integers(3, 5)), rng.uniform(7, 10), contact_s)
    return drawing.scene(
        rng,
        modes,
        rate_hz=rate_hz,
        high_hz=high_hz,
        blows=blows,
        energies_db=(42, 70),
        tail_s=rng.uniform(9, 12),
    )


def microphone(rng: Rng) -> Scene:
    """Sound pressure: high-passed, soft contact, noise of wind and room."""
    rate_hz = drawing.rate(rng, 8000.0)
    high_hz = max(drawing.top(rng, rate_hz), 200.0)
    modes = drawing.apart(rng, int(rng.integers(2, 5)), high_hz, 25.0)
    corner_hz = rng.uniform(4.0, 20.0)
    contact_s = drawing.contact(rng, modes, 2e-3, 8e-3)
    blows = drawing.hits(rng, int(rng.integers(3, 7)), drawing.spacing(modes), contact_s)
    wind = Density(((1.0, rng.uniform(1.2, 2.2)), (rng.uniform(0.02, 0.2), 0.5)), corner_hz)
    return drawing.scene(
        rng,
        modes,
        rate_hz=rate_hz,
        high_hz=high_hz,
        blows=blows,
        energies_db=(40, 66),
        density=wind,
        high_pass_hz=corner_hz,
        bits=16,
    )


def coloured(rng: Rng) -> Scene:
    """Noise that falls with frequency, and a slow drift."""
    return plain(rng, int(rng.integers(2, 5)), (32, 60), density=drawing.pink(rng))


def doubles(rng: Rng) -> Scene:
    """Some taps struck twice, the second blow 8 to 300 ms after the first."""
    made = plain(rng, int(rng.integers(2, 4)), (48, 74), taps=int(rng.integers(4, 7)))
    twice = rng.choice(len(made.hits), int(rng.integers(1, len(made.hits) - 1)), replace=False)
    blows: list[Hit] = []
    rows: list[int] = []
    for i, hit in enumerate(made.hits):
        blows.append(hit)
        rows.append(i)
        if i in twice:
            late_s = max(log_uniform(rng, 0.008, 0.3), 1.5 * hit.contact_s)
            share = rng.uniform(0.2, 1.0)
            blows.append(Hit(hit.at_s + late_s, share * hit.strength, hit.contact_s, True))
            rows.append(i)
    return replace(made, hits=tuple(blows), weights=made.weights[rows])


def clipped(rng: Rng) -> Scene:
    """The strongest taps drive the input to its rail."""
    made = plain(rng, int(rng.integers(2, 4)), (50, 76), taps=int(rng.integers(4, 7)))
    over = rng.choice(len(made.hits), int(rng.integers(1, len(made.hits) - 2)), replace=False)
    strong = tuple(
        replace(hit, strength=rng.uniform(1.5, 3.0) if i in over else rng.uniform(0.3, 0.7))
        for i, hit in enumerate(made.hits)
    )
    return replace(made, hits=strong, peak=rng.uniform(2.2, 3.0))


def many(rng: Rng) -> Scene:
    """Eight to fifteen modes, many of them neighbours."""
    rate_hz = drawing.rate(rng, 2000.0)
    high_hz = float(rng.choice([200.0, 400.0]))
    modes = drawing.apart(rng, int(rng.integers(8, 16)), high_hz, bandwidths=2.0)
    return struck(rng, modes, rate_hz, high_hz, (42, 74))


def one_tap(rng: Rng) -> Scene:
    """A single blow."""
    return plain(rng, int(rng.integers(1, 5)), (34, 64), taps=1)


def quick(rng: Rng) -> Scene:
    """Blows every one to two seconds: one decay runs into the next."""
    made = plain(rng, int(rng.integers(2, 4)), (42, 68), taps=int(rng.integers(6, 11)))
    closer = drawing.hits(rng, len(made.hits), rng.uniform(1.0, 2.0), made.hits[0].contact_s)
    return replace(made, hits=closer, duration_s=closer[-1].at_s + rng.uniform(1.5, 4.0))


def short(rng: Rng) -> Scene:
    """Little time before, between and after the blows."""
    made = plain(rng, int(rng.integers(1, 4)), (40, 64), taps=int(rng.integers(1, 4)))
    decay_s = 1 / min(-mode.pole.real for mode in made.modes)
    gap_s = float(np.clip(rng.uniform(2.5, 4.0) * decay_s, 0.8, 3.0))
    contact_s = made.hits[0].contact_s
    closer = drawing.hits(rng, len(made.hits), gap_s, contact_s, quiet_s=rng.uniform(0.6, 1.0))
    return replace(made, hits=closer, duration_s=closer[-1].at_s + gap_s)


def scatter(rng: Rng) -> Scene:
    """Poles that differ from tap to tap: a joint or a support with play."""
    taps = int(rng.integers(4, 7))
    spread = (log_uniform(rng, 1e-3, 5e-3), rng.uniform(0.0, 0.1))
    return plain(rng, int(rng.integers(1, 4)), (44, 70), taps=taps, scatter=spread)


def no_quiet(rng: Rng) -> Scene:
    """The recorder was started just before the first blow."""
    made = plain(rng, int(rng.integers(2, 4)), (42, 70))
    early_s = made.hits[0].at_s - rng.uniform(0.02, 0.2)
    sooner = tuple(replace(hit, at_s=hit.at_s - early_s) for hit in made.hits)
    return replace(made, hits=sooner, duration_s=made.duration_s - early_s)


def only_noise(rng: Rng) -> Scene:
    """No blow and no mode: noise."""
    rate_hz = drawing.rate(rng)
    density = Density(((1.0, 0.0),)) if rng.random() < 0.5 else drawing.pink(rng)
    return drawing.scene(
        rng,
        [],
        rate_hz=rate_hz,
        high_hz=drawing.top(rng, rate_hz),
        blows=(),
        energies_db=(0, 1),
        density=density,
        tail_s=rng.uniform(10, 40),
    )


def only_mains(rng: Rng) -> Scene:
    """No blow and no mode: noise with mains hum."""
    made = only_noise(rng)
    line_hz = float(rng.choice([50.0, 60.0])) * (1 + 3e-4 * rng.standard_normal())
    amplitude = drawing.amplitude_over(made.density, line_hz, rng.uniform(20, 60))
    return replace(made, tones=drawing.mains(rng, line_hz, amplitude, 7), mains_hz=line_hz)


def only_machine(rng: Rng) -> Scene:
    """No blow and no mode: noise with the wandering orders of a machine."""
    made = only_noise(rng)
    shaft_hz = log_uniform(rng, 6.0, 50.0)
    amplitude = drawing.amplitude_over(made.density, shaft_hz, rng.uniform(20, 55))
    wander = log_uniform(rng, 1e-4, 1e-3)
    return replace(made, tones=drawing.machine(rng, shaft_hz, range(1, 9), amplitude, wander))


def dull(rng: Rng) -> Scene:
    """Blows on something that does not ring, or clicks of the input: pulses and nothing after."""
    made = only_noise(rng)
    count = int(rng.integers(2, 6))
    blows = drawing.hits(rng, count, rng.uniform(2, 4), log_uniform(rng, 2e-5, 8e-3))
    amplitude = drawing.amplitude_over(made.density, 50.0, 0.0) * np.sqrt(made.rate_hz)
    loud = tuple(replace(hit, strength=hit.strength * amplitude * 20) for hit in blows)
    return replace(made, hits=loud, thump=1.0, above=(), duration_s=blows[-1].at_s + 4.0)


KINDS: dict[str, Kind] = {
    "quiet": quiet,
    "noisy": noisy,
    "pair": pair,
    "triple": triple,
    "hum": hum,
    "machine": running_machine,
    "heavy": heavy,
    "chime": chime,
    "microphone": microphone,
    "coloured": coloured,
    "doubles": doubles,
    "clipped": clipped,
    "many": many,
    "one-tap": one_tap,
    "quick": quick,
    "short": short,
    "scatter": scatter,
    "no-quiet": no_quiet,
    "only-noise": only_noise,
    "only-mains": only_mains,
    "only-machine": only_machine,
    "dull": dull,
}


def scene_of(kind: str, seed: int) -> tuple[Scene, Rng]:
    """What a recording of this kind and seed is made from, and where its noise comes from."""
    rng = np.random.default_rng([crc32(kind.encode()), seed])
    return KINDS[kind](rng), rng


def recording(kind: str, seed: int) -> Simulated:
    """The recording of this kind and seed, always the same."""
    return simulate(*scene_of(kind, seed))
