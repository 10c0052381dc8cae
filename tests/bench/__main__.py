"""Every benchmark in one table: ``python -m tests.bench --write docs/benchmarks.md``.

``--only NAME`` (repeatable) runs some of them; the lines of the others stay as they stand in the
file. ``--quick`` makes everything small.
"""

from __future__ import annotations

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
os.environ.setdefault("OMP_NUM_THREADS", "1")

import sys
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from tests.bench import page, rows
from tests.bench.asking import parser


@dataclass(frozen=True)
class Scale:
    """How much is measured."""

    runs: int
    records: int
    minutes: int
    starts: int
    keys: int
    supports: tuple[int, ...]
    lengths_s: tuple[int, ...]
    points: tuple[int, ...]


FULL = Scale(
    runs=3,
    records=36,
    minutes=60,
    starts=5,
    keys=40,
    supports=(2, 5, 10, 20, 40),
    lengths_s=(1, 10, 60, 300, 3600),
    points=(10**3, 10**4, 10**5, 10**6, 10**7),
)
QUICK = Scale(
    runs=1,
    records=6,
    minutes=2,
    starts=2,
    keys=10,
    supports=(2, 5, 10),
    lengths_s=(1, 10, 60, 300),
    points=(10**3, 10**4, 10**5, 10**6, 10**7),
)


def fixes(scale: Scale, _seed: int) -> list[rows.Row]:
    """Fix evaluations a second."""
    from tests.bench import screening

    return screening.rows(scale.runs)


def taps(scale: Scale, seed: int) -> list[rows.Row]:
    """Modes from taps."""
    from tests.bench import from_taps

    return from_taps.rows(seed, scale.records)


def long(scale: Scale, _seed: int) -> list[rows.Row]:
    """Welch over a long recording."""
    from tests.bench import long_files

    return long_files.rows(scale.minutes, scale.runs)


def start(scale: Scale, _seed: int) -> list[rows.Row]:
    """Cold start."""
    from tests.bench import cold_start

    return cold_start.rows(scale.starts)


def samples(scale: Scale, _seed: int) -> list[rows.Row]:
    """Workups of the samples."""
    from tests.bench import workups

    return workups.rows(scale.runs)


def screen(scale: Scale, _seed: int) -> list[rows.Row]:
    """Redraw, what-if step, key to screen."""
    from tests.bench import screen
    from tests.bench.workups import ROOT

    return screen.rows(ROOT / "samples" / "riser" / "job.toml", scale.keys, scale.runs)


def by_supports(scale: Scale, _seed: int) -> list[rows.Row]:
    """Growth of a workup."""
    from tests.bench import many_supports

    return many_supports.growth(scale.supports)


def by_length(scale: Scale, _seed: int) -> list[rows.Row]:
    """Growth of spectra."""
    from tests.bench import long_files

    return long_files.growth(scale.lengths_s, scale.runs)


def by_points(scale: Scale, _seed: int) -> list[rows.Row]:
    """Growth of a redraw."""
    from tests.bench import screen

    return screen.growth(scale.points, scale.keys)


BENCHMARKS: dict[str, Callable[[Scale, int], list[rows.Row]]] = {
    "fixes": fixes,
    "taps": taps,
    "long": long,
    "start": start,
    "samples": samples,
    "screen": screen,
    "supports": by_supports,
    "length": by_length,
    "points": by_points,
}
"""In the order of the table."""


def main() -> None:
    """Measure, print, and write where asked after each benchmark."""
    asked = parser("tests.bench", __doc__, "seed", "write")
    asked.add_argument("--quick", action="store_true", help="small sizes, one round")
    asked.add_argument("--only", action="append", choices=BENCHMARKS, metavar="NAME")
    args = asked.parse_args()
    for name in args.only or BENCHMARKS:
        print(f"{name} ...", file=sys.stderr, flush=True)
        measured = measure(name, QUICK if args.quick else FULL, args.seed)
        print(rows.table(measured.lines), flush=True)
        if args.write:
            write(args.write, measured)


def measure(name: str, scale: Scale, seed: int) -> page.Measured:
    """The lines of one benchmark, and what else ran on the machine meanwhile."""
    before = os.getloadavg()[0]
    found = BENCHMARKS[name](scale, seed)
    load = max(before, os.getloadavg()[0])
    busy = load > page.cores()
    lines = tuple(rows.lines(name, found, busy=busy))
    return page.Measured(name, lines, page.circumstances(name, scale == QUICK, load))


def write(path: Path, measured: page.Measured) -> None:
    """Put one benchmark's lines in their place on the page."""
    old = path.read_text("utf-8") if path.exists() else ""
    path.write_text(page.renewed(old, measured, tuple(BENCHMARKS)), "utf-8")


if __name__ == "__main__":
    main()
