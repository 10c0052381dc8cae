"""Promised against kept on simulated spans: ``python -m tests.bench.promises --seed 7``."""

from __future__ import annotations

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
os.environ.setdefault("OMP_NUM_THREADS", "1")

import argparse
import json
import sys
from collections.abc import Iterator, Sequence
from dataclasses import asdict
from multiprocessing import get_context
from pathlib import Path

from tests.bench.promises import aims, tables
from tests.bench.promises.trial import Plan, Trial, plans, run
from tests.bench.promises.truth import LIKE, UNLIKE

EACH = "add each span as a JSON line; spans that stand there already are not answered again"


def main() -> None:
    """Answer the spans and print what came out."""
    args = arguments().parse_args()
    ways = (args.way,) if args.way else (LIKE, UNLIKE)
    planned = plans(ways, args.spans, args.seed)
    trials = read(args.each) if args.each else []
    done = {(trial.family, trial.way, trial.seed) for trial in trials}
    left = [plan for plan in planned if (plan.family, plan.way, plan.seed) not in done]
    for trial in trials_of(left, args.jobs):
        trials.append(trial)
        if args.each:
            with args.each.open("a", encoding="utf-8") as file:
                file.write(json.dumps(asdict(trial)) + "\n")
    for way in ways:
        print(f"\nTruth {way}\n{tables.aligned(tables.table(trials, way))}")
        print(f"\n{tables.aligned(tables.fifths(trials, way))}")
        print(f"\n{tables.aligned(tables.by_worth(trials, way))}")
        print(f"\n{tables.aligned(aims.table(trials, way))}")
        print("\n".join(tables.totals(trials, way)))
    if args.plot:
        from tests.bench.promises.calibration_plot import plot

        plot(trials, args.plot)
    if args.write:
        from tests.bench.promises.report import reading_in, report

        reading = reading_in(args.write.read_text("utf-8")) if args.write.exists() else ""
        args.write.write_text(report(trials, args.seed, args.spans, reading), "utf-8")


def arguments() -> argparse.ArgumentParser:
    """Words of the command line."""
    parser = argparse.ArgumentParser(prog="python -m tests.bench.promises", description=__doc__)
    parser.add_argument("--seed", type=int, default=1, help="start of the random numbers")
    parser.add_argument("--spans", type=int, default=200, help="spans, shared by the families")
    parser.add_argument("--way", choices=(LIKE, UNLIKE), help="only this truth (default: both)")
    parser.add_argument("--jobs", type=int, default=2, help="processes")
    parser.add_argument("--each", type=Path, metavar="FILE", help=EACH)
    parser.add_argument("--write", type=Path, metavar="FILE", help="write the tables as Markdown")
    parser.add_argument("--plot", type=Path, metavar="FILE", help="draw promised against kept")
    return parser


def read(path: Path) -> list[Trial]:
    """Trials of an earlier run that was stopped, or whose page is to be written anew."""
    lines = path.read_text("utf-8").splitlines() if path.exists() else []
    return [Trial(**json.loads(line)) for line in lines]


def trials_of(planned: Sequence[Plan], jobs: int) -> Iterator[Trial]:
    """Trials in the order of the plan."""
    if jobs < 2:
        yield from map(run, planned)
        return
    with get_context("spawn").Pool(jobs) as pool:
        for i, trial in enumerate(pool.imap(run, planned)):
            print(f"\r{i + 1} of {len(planned)} ", end="", file=sys.stderr, flush=True)
            yield trial
    print(file=sys.stderr)


if __name__ == "__main__":
    main()
