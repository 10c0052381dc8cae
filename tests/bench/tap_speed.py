"""Processor time by step from five taps of 8 s at 48 kHz: ``python -m tests.bench.tap_speed``.

Two recordings: a simulated line as in the accuracy table, with hum, a close pair and modes above
the range; and plain sums of decays whose shares change from blow to blow.
"""

from __future__ import annotations

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
os.environ.setdefault("OMP_NUM_THREADS", "1")

import time
from collections.abc import Callable, Iterator
from contextlib import ExitStack, contextmanager
from typing import Any
from unittest.mock import patch

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal import modes
from fieldkit.signal.modes import estimate_modes
from fieldkit.signal.taps import cut, find_taps
from tests.bench.accuracy.recordings import Hit, Scene, Simulated, TrueMode, simulate
from tests.bench.accuracy.surroundings import Density, SteadyTone
from tests.bench.asking import parser

STEPS = {
    "preparation": "prepare",
    "search": "search",
    "pruning": "pruned",
    "drift": "with_drift",
    "polish": "polished",
    "verdicts": "judged",
}
"""Step to the function of ``fieldkit.signal.modes`` that does it."""

Samples = NDArray[np.float64]

RATE_HZ, HIGH_HZ = 48_000.0, 200.0
READING, REST, TOTAL = "reading taps", "everything else", "together"


def main() -> None:
    """Print milliseconds by step, the best of several runs."""
    asked = parser("tests.bench.tap_speed", __doc__, "runs")
    asked.set_defaults(runs=7)
    count = asked.parse_args().runs
    best = [quickest(made, count) for made in (five_taps().samples, uneven_decays())]
    print(f"five taps of 8 s at {RATE_HZ / 1000:g} kHz, one core       line    decays")
    for step in best[0]:
        print(f"  {step:36}" + "".join(f"{1000 * run[step]:7.0f} ms" for run in best))


def quickest(samples: Samples, count: int) -> dict[str, float]:
    """Processor seconds by step of the best of several runs, after one to warm up."""
    runs = [timed(samples) for _ in range(count + 1)][1:]
    return min(runs, key=lambda run: run[TOTAL])


def uneven_decays() -> Samples:
    """Five modes, each with a share of its own in every blow; noise and one hum line."""
    modes = (
        (TrueMode(14.2, 0.008), 1.0),
        (TrueMode(23.5, 0.012), 0.8),
        (TrueMode(26.1, 0.01), 0.5),
        (TrueMode(61.0, 0.006), 0.6),
        (TrueMode(118.0, 0.01), 0.3),
    )
    rng = np.random.default_rng(1)
    at_s = 2.0 + 8.0 * np.arange(5)
    time_s = np.arange(int(42 * RATE_HZ)) / RATE_HZ
    samples = 0.002 * rng.normal(size=len(time_s)) + 0.003 * np.sin(2 * np.pi * 50 * time_s + 1)
    for start_s in at_s:
        first = int(start_s * RATE_HZ)
        since_s = time_s[first : first + int(8 * RATE_HZ)] - start_s
        strength = 0.3 * rng.uniform(0.7, 1.3)
        for mode, share in modes:
            omega, zeta = 2 * np.pi * mode.frequency_hz, mode.damping_ratio
            ringing = np.sin(omega * np.sqrt(1 - zeta**2) * since_s)
            height = strength * share * rng.uniform(0.6, 1.0)
            samples[first : first + len(since_s)] += (
                height * np.exp(-zeta * omega * since_s) * ringing
            )
    return samples


def five_taps() -> Simulated:
    """Five modes with hum beside them, a quiet start, five uneven taps of 8 s."""
    frequencies_hz = (6.3, 11.8, 24.1, 24.9, 71.0)
    dampings = (0.02, 0.012, 0.008, 0.01, 0.006)
    at_s = 2.5 + 8.0 * np.arange(5)
    strengths = (1.0, 0.5, 0.8, 0.3, 0.7)
    uneven = 1 + 0.2 * np.random.default_rng(2).standard_normal((5, 5))
    scene = Scene(
        rate_hz=RATE_HZ,
        duration_s=42.5,
        high_hz=HIGH_HZ,
        hits=tuple(Hit(float(a), s, 0.002) for a, s in zip(at_s, strengths, strict=True)),
        density=Density(((1.0, 0.0), (0.3, 1.0))),
        modes=tuple(TrueMode(f, z) for f, z in zip(frequencies_hz, dampings, strict=True)),
        energies_db=(60.0, 66.0, 58.0, 62.0, 54.0),
        phases=(0.0, 0.2, -0.1, 3.0, 0.1),
        weights=uneven,
        tones=tuple(SteadyTone(50.0 * k, 30.0 / k, float(k)) for k in (1, 2, 3)),
        above=(TrueMode(900.0, 0.02),),
        bits=16,
    )
    return simulate(scene, np.random.default_rng(1))


def timed(samples: Samples) -> dict[str, float]:
    """Processor seconds by step of one run."""
    spent = dict.fromkeys([READING, *STEPS], 0.0)
    start = time.process_time()
    search = find_taps(samples, RATE_HZ)
    records = cut(samples, RATE_HZ, search)
    spent[READING] = time.process_time() - start
    with watched(spent):
        estimate_modes(records, high_hz=HIGH_HZ)
    total = time.process_time() - start
    return spent | {REST: total - sum(spent.values()), TOTAL: total}


@contextmanager
def watched(spent: dict[str, float]) -> Iterator[None]:
    """Time what the estimator spends in each step."""
    with ExitStack() as stack:
        for step, name in STEPS.items():
            fresh = clocked(getattr(modes, name), step, spent)
            stack.enter_context(patch.object(modes, name, fresh))
        yield


def clocked(step: Callable[..., Any], name: str, spent: dict[str, float]) -> Callable[..., Any]:
    """The same function, its processor time added up."""

    def run(*args: Any, **words: Any) -> Any:
        start = time.process_time()
        try:
            return step(*args, **words)
        finally:
            spent[name] += time.process_time() - start

    return run


if __name__ == "__main__":
    main()
