"""Costs of work in this process and in fresh ones, what is compared taken in turn."""

from __future__ import annotations

import json
import resource
import subprocess
import sys
import time
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]

ROOT = Path(__file__).resolve().parents[2]
PEAK = """
from pathlib import Path

def peak():
    status = Path("/proc/self/status").read_text().split()
    return int(status[status.index("VmHWM:") + 1]) * 1024
"""
"""Stands before the code of ``cost``."""


@dataclass(frozen=True)
class Cost:
    """Of one piece of work in a process of its own."""

    wall_s: float
    cpu_s: float
    bytes: int
    """By which the peak of the process grew."""


def in_turn(
    works: Mapping[str, Callable[[], object]],
    runs: int,
    clock: Callable[[], float] = time.process_time,
    *,
    warm: bool = True,
) -> dict[str, Real]:
    """(runs,) seconds of each piece of work, one after the other in every round."""
    rounds = [
        [_seconds(work, clock) for work in works.values()] for _ in range(runs + (1 if warm else 0))
    ]
    kept = np.array(rounds[1:] if warm else rounds)
    return {name: kept[:, i] for i, name in enumerate(works)}


def processes_in_turn(codes: Mapping[str, str], runs: int) -> dict[str, Real]:
    """(runs, 2) seconds of fresh processes: by the clock, of processor; one round to warm up."""
    rounds = [[_process_seconds(code) for code in codes.values()] for _ in range(runs + 1)]
    kept = np.array(rounds[1:])
    return {name: kept[:, i] for i, name in enumerate(codes)}


def ratio(ours: Real, theirs: Real) -> float:
    """Median over the rounds."""
    return float(np.median(ours / theirs))


def cost(code: str, *words: object, said_on_stderr: bool = False) -> Cost:
    """Of a fresh process; its last line says what it cost."""
    done = subprocess.run(
        [sys.executable, "-c", PEAK + code, *map(str, words)],
        check=True,
        capture_output=True,
        text=True,
        cwd=ROOT,
    )
    said = done.stderr if said_on_stderr else done.stdout
    return Cost(**json.loads(said.strip().splitlines()[-1]))


def _seconds(work: Callable[[], object], clock: Callable[[], float]) -> float:
    start = clock()
    work()
    return clock() - start


def _process_seconds(code: str) -> tuple[float, float]:
    start, before = time.perf_counter(), _children_cpu_s()
    subprocess.run([sys.executable, "-c", code], check=True, stdout=subprocess.DEVNULL, cwd=ROOT)
    return time.perf_counter() - start, _children_cpu_s() - before


def _children_cpu_s() -> float:
    used = resource.getrusage(resource.RUSAGE_CHILDREN)
    return used.ru_utime + used.ru_stime
