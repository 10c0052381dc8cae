"""The accuracy table from fresh seeds: ``python -m tests.bench.accuracy --seed 12``."""

from __future__ import annotations

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
os.environ.setdefault("OMP_NUM_THREADS", "1")

import argparse
import sys
from collections.abc import Iterator, Sequence
from multiprocessing import get_context

from tests.bench import asking
from tests.bench.accuracy import replay, tables
from tests.bench.accuracy.kinds import KINDS
from tests.bench.accuracy.trial import WAYS, Plan, Trial, run

_SEEDS_PER_RUN = 100_000


def main() -> None:
    """Run the recordings and print what came out."""
    args = arguments().parse_args()
    if args.replay is not None:
        for kind in args.kind or KINDS:
            print(replay.story(kind, args.replay))
        return
    trials = []
    ways = (args.way,) if args.way else tuple(WAYS)
    plans = planned(args.kind or list(KINDS), args.records, args.seed, ways)
    for trial in trials_of(plans, args.jobs):
        trials.append(trial)
        for line in replay.failings(trial) if args.verbose else ():
            print(line, flush=True)
    for way in ways:
        print(f"\n{way.capitalize()}\n{tables.aligned(tables.table(trials, way))}")
        print("\n".join(tables.totals(trials, way)))
    if args.plot:
        from tests.bench.accuracy.coverage_plot import plot

        plot(trials, args.plot)
    if args.write:
        from tests.bench.accuracy.report import report

        args.write.write_text(report(trials, args.seed), "utf-8")


def arguments() -> argparse.ArgumentParser:
    """Words of the command line."""
    parser = asking.parser("tests.bench.accuracy", __doc__, "seed", "jobs", "write", "plot")
    parser.add_argument("--records", type=int, default=220, help="recordings, shared by the kinds")
    parser.add_argument("--kind", action="append", choices=KINDS, help="only this kind; repeatable")
    parser.add_argument("--way", choices=WAYS, help="only this way (default: both)")
    parser.add_argument("--verbose", action="store_true", help="name what failed, with its seed")
    parser.add_argument("--replay", type=int, metavar="SEED", help="tell all about one recording")
    return parser


def planned(kinds: Sequence[str], records: int, seed: int, ways: tuple[str, ...]) -> list[Plan]:
    """Kind after kind, equally many recordings of each."""
    each = -(-records // len(kinds))
    return [Plan(kind, seed * _SEEDS_PER_RUN + i, ways) for kind in kinds for i in range(each)]


def trials_of(plans: Sequence[Plan], jobs: int) -> Iterator[Trial]:
    """Trials in the order of the plan."""
    if jobs < 2:
        yield from map(run, plans)
        return
    with get_context("spawn").Pool(jobs) as pool:
        for i, trial in enumerate(pool.imap(run, plans)):
            print(f"\r{i + 1} of {len(plans)} ", end="", file=sys.stderr, flush=True)
            yield trial
    print(file=sys.stderr)


if __name__ == "__main__":
    main()
