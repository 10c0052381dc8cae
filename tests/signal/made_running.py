"""Running records of known modes: random forces through exact modal filters, and machine lines."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]
SETTLE_S = 8.0


def stirred(
    modes: Sequence[tuple[float, float]],
    *,
    seed: int,
    duration_s: float = 60.0,
    rate_hz: float = 600.0,
    noise: float = 0.05,
    colour_hz: float | None = None,
    swell: float = 0.0,
) -> Real:
    """(n,) acceleration of modes (frequency, damping ratio) of like strength under random force.

    The force is white or falls off above ``colour_hz``, and swells by a share of its level every
    23 s; noise is added in proportion.
    """
    rng = np.random.default_rng(seed)
    count = int((duration_s + SETTLE_S) * rate_hz)
    total = np.zeros(count)
    for frequency_hz, damping in modes:
        force = _force(rng, count, rate_hz, colour_hz)
        force *= 1 + swell * np.sin(2 * math.pi * np.arange(count) / rate_hz / 23.0)
        answer = _acceleration(frequency_hz, damping, force, rate_hz)
        total += answer / np.std(answer)
    kept = total[int(SETTLE_S * rate_hz) :]
    return kept + (noise if modes else 1.0) * rng.standard_normal(len(kept))


def machine(
    lines: Sequence[tuple[float, float]],
    count: int,
    *,
    seed: int,
    rate_hz: float = 600.0,
    wander: float = 0.0,
) -> Real:
    """(n,) lines (frequency, amplitude) of one shaft whose speed wanders over some 3 s."""
    from scipy.signal import lfilter

    rng = np.random.default_rng(seed)
    keep = math.exp(-1 / (3.0 * rate_hz))
    drift = lfilter([math.sqrt(1 - keep**2)], [1, -keep], rng.standard_normal(count))
    turned_s = np.cumsum(1 + wander * drift) / rate_hz
    return np.sum(
        [a * np.sin(2 * math.pi * (f * turned_s + rng.random())) for f, a in lines], axis=0
    )


def _force(rng: np.random.Generator, count: int, rate_hz: float, colour_hz: float | None) -> Real:
    from scipy.signal import lfilter

    white = rng.standard_normal(count)
    if colour_hz is None:
        return white
    keep = math.exp(-2 * math.pi * colour_hz / rate_hz)
    return np.asarray(lfilter([1 - keep], [1, -keep], white))


def _acceleration(frequency_hz: float, damping: float, force: Real, rate_hz: float) -> Real:
    """Exact for a force that runs straight from sample to sample."""
    from scipy.signal import cont2discrete, lfilter

    omega = 2 * math.pi * frequency_hz
    system = (np.array([1.0, 0.0, 0.0]), np.array([1.0, 2 * damping * omega, omega**2]))
    above, below, _ = cont2discrete(system, 1 / rate_hz, method="foh")
    return np.asarray(lfilter(above.ravel(), below, force))
