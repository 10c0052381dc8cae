"""Many workups in one process: ``python -m tests.abuse.soak --workups 1000``.

A short line with a typed peak, worked out again and again; every tenth from its file with a tap
recording beside it. Memory that is held after each, once things are loaded, must not grow.
"""

from __future__ import annotations

import argparse
import gc
import sys
import tempfile
import tracemalloc
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from fieldkit import workup
from fieldkit.job.schema import load_job
from fieldkit.progress import Progress
from tests.abuse.audio import wav
from tests.abuse.case import JOB, TAP

SETTLED = 0.3
"""Share of the run after which everything is loaded and every cache filled."""
MOST_GROWTH = 0.02
"""Of resident memory, over the rest of the run."""


@dataclass(frozen=True)
class Soaked:
    """Resident memory after each workup, MB."""

    resident_mb: np.ndarray

    @property
    def growth(self) -> float:
        """By a straight line through what came after settling, relative."""
        later = self.resident_mb[int(SETTLED * len(self.resident_mb)) :]
        steps = np.arange(len(later))
        slope = np.polyfit(steps, later, 1)[0]
        return float(slope * len(later) / later.mean())

    def line(self) -> str:
        """In one line."""
        first, last = self.resident_mb[int(SETTLED * len(self.resident_mb))], self.resident_mb[-1]
        return (
            f"{len(self.resident_mb)} workups: {first:.1f} MB once settled, {last:.1f} MB at the "
            f"end, {100 * self.growth:+.2f} % by a straight line"
        )


def soaked(workups: int, folder: Path) -> Soaked:
    """Work the same two jobs out again and again."""
    typed, tapped = folder / "typed.toml", folder / "tapped.toml"
    typed.write_text(JOB, "utf-8")
    tapped.write_text(JOB + TAP, "utf-8")
    (folder / "tap.wav").write_bytes(wav())
    resident = []
    for i in range(workups):
        done = workup.run(load_job(tapped if i % 10 == 5 else typed), Progress())
        assert done.detuning is not None, done.refused
        del done
        gc.collect()
        resident.append(resident_mb())
    return Soaked(np.array(resident))


def held_after(workups: int, folder: Path) -> int:
    """Bytes of Python objects that the second half of so many workups leaves behind."""
    soaked(workups, folder)
    tracemalloc.start()
    try:
        before = tracemalloc.get_traced_memory()[0]
        soaked(workups, folder)
        gc.collect()
        return tracemalloc.get_traced_memory()[0] - before
    finally:
        tracemalloc.stop()


def resident_mb() -> float:
    """Of this process now."""
    pages = int(Path("/proc/self/statm").read_text().split()[1])
    return pages * 4096 / 1e6


def main() -> None:
    """Print the line; exit status 1 where memory grows."""
    asked = argparse.ArgumentParser(description=__doc__)
    asked.add_argument("--workups", type=int, default=1000)
    options = asked.parse_args()
    with tempfile.TemporaryDirectory() as name:
        found = soaked(options.workups, Path(name))
    sys.stdout.write(found.line() + "\n")
    sys.exit(int(found.growth > MOST_GROWTH))


if __name__ == "__main__":
    main()
