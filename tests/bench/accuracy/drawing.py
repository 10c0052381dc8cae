"""Random parts of scenes: rates, modes, hits, noise, machines."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from tests.bench.accuracy.recordings import Hit, Scene, TrueMode
from tests.bench.accuracy.surroundings import Density, SteadyTone

Real = NDArray[np.float64]
Rng = np.random.Generator

_RATES_HZ = (1000, 1024, 2000, 2400, 4000, 8000, 11025, 22050, 44100, 48000)
_LOWEST_HZ = 3.0
_TIME_CONSTANTS = 7.0
_LEAST_DECAY_PER_S = 0.6
_ABOVE_RANGE = (1.6, 5.0)


def rate(rng: Rng, least_hz: float = 1000.0) -> float:
    """A sampling rate people use."""
    return float(rng.choice([r for r in _RATES_HZ if r >= least_hz]))


def top(rng: Rng, rate_hz: float) -> float:
    """Upper end of the reported range."""
    return float(min(rng.choice([80.0, 200.0, 200.0, 400.0]), 0.4 * rate_hz))


def log_uniform(rng: Rng, low: float, high: float) -> float:
    return float(np.exp(rng.uniform(np.log(low), np.log(high))))


def damped(rng: Rng, frequency_hz: float, low: float = 0.002, high: float = 0.03) -> TrueMode:
    """A mode of usual damping, none that rings for more than a record's length."""
    least = _LEAST_DECAY_PER_S / (2 * np.pi * frequency_hz)
    return TrueMode(frequency_hz, max(log_uniform(rng, low, high), least))


def apart(
    rng: Rng, count: int, high_hz: float, low_hz: float = _LOWEST_HZ, bandwidths: float = 6.0
) -> list[TrueMode]:
    """Modes of usual damping with so many bandwidths between them, lowest first."""
    modes: list[TrueMode] = []
    for _ in range(400):
        if len(modes) == count:
            break
        fresh = damped(rng, log_uniform(rng, low_hz, 0.9 * high_hz))
        if all(clear(fresh, mode, bandwidths) for mode in modes):
            modes.append(fresh)
    return sorted(modes, key=lambda mode: mode.frequency_hz)


def clear(one: TrueMode, other: TrueMode, bandwidths: float = 6.0) -> bool:
    """So many half-power bandwidths between them."""
    gap = abs(one.frequency_hz - other.frequency_hz)
    return gap > bandwidths * max(one.bandwidth_hz, other.bandwidth_hz)


def spacing(modes: Sequence[TrueMode], least_s: float = 2.0, most_s: float = 9.0) -> float:
    """Seconds from blow to blow that let the slowest mode ring out, within reason."""
    slowest = min((-mode.pole.real for mode in modes), default=2.0)
    return float(np.clip(_TIME_CONSTANTS / slowest, least_s, most_s))


def contact(
    rng: Rng, modes: Sequence[TrueMode], low_s: float = 5e-4, high_s: float = 8e-3
) -> float:
    """Length of contact, short enough to excite the highest mode."""
    highest = max((mode.frequency_hz for mode in modes), default=50.0)
    return min(log_uniform(rng, low_s, high_s), max(0.7 / highest, low_s))


def hits(
    rng: Rng,
    count: int,
    apart_s: float,
    contact_s: float,
    quiet_s: float = 2.5,
    strengths: tuple[float, float] = (0.2, 1.0),
) -> tuple[Hit, ...]:
    """Uneven blows, at uneven times; the strongest has strength 1."""
    gaps = apart_s * rng.uniform(0.9, 1.2, count)
    at_s = quiet_s + rng.uniform(0, 0.3) + np.concatenate([[0.0], np.cumsum(gaps)[:-1]])
    strength = np.exp(rng.uniform(*np.log(strengths), count))
    strength *= strengths[1] / strength.max()
    lengths = contact_s * rng.uniform(0.8, 1.25, count)
    planned = zip(at_s, strength, lengths, strict=True)
    return tuple(Hit(float(a), float(s), float(c)) for a, s, c in planned)


def weights(rng: Rng, hit_count: int, mode_count: int, spread: float = 0.15) -> Real:
    """How evenly the blows move each mode: no blow falls quite where another fell."""
    return np.clip(1 + spread * rng.standard_normal((hit_count, mode_count)), 0.1, None)


def scene(
    rng: Rng,
    modes: Sequence[TrueMode],
    *,
    rate_hz: float,
    high_hz: float,
    blows: Sequence[Hit],
    energies_db: tuple[float, float],
    density: Density | None = None,
    tail_s: float | None = None,
    **more: object,
) -> Scene:
    """A scene with what was not said drawn at random."""
    count, struck = len(modes), len(blows)
    last_s = blows[-1].at_s if blows else 0.0
    said = {
        "weights": weights(rng, struck, count),
        "above": above(rng, high_hz, rate_hz),
        "thump": rng.choice([0.0, 0.3, 2.0]),
        "peak": rng.uniform(0.2, 0.9),
        "bits": int(rng.choice([0, 16])),
        "energies_db": tuple(rng.uniform(*energies_db, count)),
    } | more
    return Scene(
        rate_hz=rate_hz,
        high_hz=high_hz,
        duration_s=last_s + (spacing(modes) if tail_s is None else tail_s),
        hits=tuple(blows),
        density=density or Density(((1.0, 0.0),)),
        modes=tuple(modes),
        phases=tuple(rng.choice([-1.0, 1.0], count) * np.pi / 2 + rng.normal(0, 0.2, count)),
        **said,  # type: ignore[arg-type]
    )


def above(rng: Rng, high_hz: float, rate_hz: float) -> tuple[TrueMode, ...]:
    """Up to three modes above the reported range, as every blow wakes them."""
    low, high = (factor * high_hz for factor in _ABOVE_RANGE)
    if high > 0.45 * rate_hz:
        return ()
    wanted = int(rng.integers(0, 4))
    return tuple(damped(rng, rng.uniform(low, high), 0.005, 0.03) for _ in range(wanted))


def pink(rng: Rng) -> Density:
    """Noise that falls with frequency, over white noise."""
    return Density(((1.0, rng.uniform(0.8, 2.0)), (rng.uniform(0.01, 0.3), 0.0)))


def machine(
    rng: Rng,
    shaft_hz: float,
    orders: Sequence[int],
    amplitude: float,
    wander: float,
) -> tuple[SteadyTone, ...]:
    """Orders of one shaft, wandering together, the higher ones weaker."""
    seed = int(rng.integers(1 << 30))
    return tuple(
        SteadyTone(
            order * shaft_hz,
            amplitude * rng.uniform(0.3, 1.0) / np.sqrt(order),
            rng.uniform(0, 2 * np.pi),
            wander,
            seed,
        )
        for order in orders
    )


def mains(rng: Rng, line_hz: float, amplitude: float, orders: int = 5) -> tuple[SteadyTone, ...]:
    """Hum at a mains frequency and its multiples, as steady as the grid or quite."""
    wander = float(rng.choice([0.0, log_uniform(rng, 1e-5, 1e-4)]))
    return machine(rng, line_hz, range(1, orders + 1), amplitude, wander)


def amplitude_over(density: Density, frequency_hz: float, level_db: float) -> float:
    """Of a tone whose energy in one second is so far over the noise density."""
    return float(np.sqrt(10 ** (level_db / 10) * density.at(frequency_hz)))
