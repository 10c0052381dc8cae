"""Modes from taps beside averaged-spectrum peaks: ``python -m tests.bench.from_taps --seed 5``.

A small sample of the recordings of ``tests.bench.accuracy``, which has the whole. Peak picking is
told when each blow fell and how many modes there are; the estimator gets the samples alone.
"""

from __future__ import annotations

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from tests.bench.accuracy.estimating import automatic
from tests.bench.accuracy.kinds import recording
from tests.bench.accuracy.scoring import FoundMode, Score, scored
from tests.bench.accuracy.tally import Tally, robust
from tests.bench.accuracy.trial import bounds_of, picked
from tests.bench.asking import parser
from tests.bench.rows import Row, lines, table

KINDS = ("quiet", "noisy", "pair", "hum", "machine", "microphone")
USUAL = "highest peaks of the averaged spectrum, half-power bandwidth, blows known"
_SEEDS_PER_RUN = 100_000


@dataclass(frozen=True)
class Trial:
    """One recording both ways."""

    score: Score
    ours_s: float
    usual_s: float


def rows(seed: int, records: int) -> list[Row]:
    """Errors over the Cramer-Rao bound, modes found, and time."""
    plans = [(kind, seed * _SEEDS_PER_RUN + i) for i in range(records) for kind in KINDS][:records]
    trials = [trial(*plan) for plan in plans]
    tally = Tally(tuple(t.score for t in trials))
    return [
        _error_row("frequency", tally.both, _frequency_over_bound, len(trials)),
        _error_row("damping", tally.both, _damping_over_bound, len(trials)),
        _found_row(tally),
        _time_row(trials),
    ]


def trial(kind: str, seed: int) -> Trial:
    """Simulate, then peak picking and the estimator in turn."""
    made = recording(kind, seed)
    picked(made)
    start = time.process_time()
    peaks = picked(made)
    usual_s = time.process_time() - start
    score = scored(made, bounds_of(made), automatic(made), peaks)
    return Trial(score, score.cpu_s, usual_s)


def _frequency_over_bound(mode: FoundMode) -> tuple[float, float]:
    """Ours and that of the picked peak."""
    assert mode.picked is not None
    usual_hz = mode.picked.frequency_hz - mode.true.frequency_hz
    return mode.frequency_ratio, usual_hz / mode.bound.frequency_sd_hz


def _damping_over_bound(mode: FoundMode) -> tuple[float, float]:
    """Ours and that of the picked peak."""
    assert mode.picked is not None
    usual = mode.picked.damping_ratio - mode.true.damping_ratio
    return mode.damping_ratio, usual / mode.bound.damping_sd


def _error_row(
    what: str,
    modes: Sequence[FoundMode],
    errors: Callable[[FoundMode], tuple[float, float]],
    records: int,
) -> Row:
    both = np.array([errors(mode) for mode in modes])
    ours, usual = robust(both[:, 0]), robust(both[:, 1])
    note = f"{len(both)} modes of {records} recordings that both found, from medians"
    name = f"{what} of a mode from taps: error over the Cramér-Rao bound"
    return Row(name, ours, usual, ours / usual, USUAL, "of the bound", note)


def _found_row(tally: Tally) -> Row:
    ours = 100 * tally.share(lambda s: len(s.found), lambda s: s.estimable)
    usual = 100 * tally.share(lambda s: s.picked, lambda s: s.estimable)
    return Row(
        "modes from taps: found of those the data hold", ours, usual, ours / usual, USUAL, "%"
    )


def _time_row(trials: Sequence[Trial]) -> Row:
    ours = 1e3 * np.array([t.ours_s for t in trials])
    usual = 1e3 * np.array([t.usual_s for t in trials])
    ratio = float(np.median(ours / usual))
    medians = float(np.median(ours)), float(np.median(usual))
    return Row("modes from taps: one recording", *medians, ratio, USUAL, "ms of processor")


def main() -> None:
    """Print the table."""
    asked = parser("tests.bench.from_taps", __doc__, "seed")
    asked.add_argument("--records", type=int, default=24, help="recordings, shared by the kinds")
    args = asked.parse_args()
    print(table(lines("taps", rows(args.seed, args.records), busy=False)))


if __name__ == "__main__":
    main()
