"""Processor time by step from five taps of 8 s at 48 kHz: ``python -m tests.bench.tap_speed``."""

from __future__ import annotations

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
os.environ.setdefault("OMP_NUM_THREADS", "1")

import argparse
import time
from collections.abc import Callable, Iterator
from contextlib import ExitStack, contextmanager
from typing import Any
from unittest.mock import patch

import numpy as np

from fieldkit.signal import modes
from fieldkit.signal.modes import estimate_modes
from fieldkit.signal.taps import cut, find_taps
from tests.bench.accuracy.recordings import Hit, Scene, Simulated, TrueMode, simulate
from tests.bench.accuracy.surroundings import Density, SteadyTone

STEPS = {
    "preparation": "prepare",
    "search": "search",
    "pruning": "pruned",
    "drift": "with_drift",
    "polish": "polished",
    "verdicts": "judged",
}
"""Step to the function of ``fieldkit.signal.modes`` that does it."""

READING, REST, TOTAL = "reading taps", "everything else", "together"


def main() -> None:
    """Print milliseconds by step, the best of several runs."""
    parser = argparse.ArgumentParser(prog="python -m tests.bench.tap_speed", description=__doc__)
    parser.add_argument("--runs", type=int, default=7)
    made = five_taps()
    runs = [timed(made) for _ in range(parser.parse_args().runs + 1)][1:]
    best = min(runs, key=lambda run: run[TOTAL])
    print(f"five taps, {len(made.samples) / made.rate_hz:.1f} s at {made.rate_hz:g} Hz, one core")
    for step, seconds in best.items():
        print(f"  {step:16} {1000 * seconds:6.0f} ms")


def five_taps() -> Simulated:
    """Five modes with hum beside them, a quiet start, five uneven taps of 8 s."""
    frequencies_hz = (6.3, 11.8, 24.1, 24.9, 71.0)
    dampings = (0.02, 0.012, 0.008, 0.01, 0.006)
    at_s = 2.5 + 8.0 * np.arange(5)
    strengths = (1.0, 0.5, 0.8, 0.3, 0.7)
    uneven = 1 + 0.2 * np.random.default_rng(2).standard_normal((5, 5))
    scene = Scene(
        rate_hz=48_000.0,
        duration_s=42.5,
        high_hz=200.0,
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


def timed(made: Simulated) -> dict[str, float]:
    """Processor seconds by step of one run."""
    spent = dict.fromkeys([READING, *STEPS], 0.0)
    start = time.process_time()
    search = find_taps(made.samples, made.rate_hz)
    records = cut(made.samples, made.rate_hz, search)
    spent[READING] = time.process_time() - start
    with watched(spent):
        estimate_modes(records, high_hz=made.high_hz)
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
