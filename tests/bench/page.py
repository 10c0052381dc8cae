"""The page of the benchmarks, renewed one benchmark at a time."""

from __future__ import annotations

import os
import platform
from collections.abc import Sequence
from dataclasses import dataclass

from tests.bench import rows

INTRODUCTION = """# Benchmarks

`python -m tests.bench --write docs/benchmarks.md` writes this page; `--only NAME` renews the lines
of one benchmark. Every line stands beside what one would otherwise do, measured in the same run,
in turn where both are short. *ratio* is fieldkit's figure over the other, the median of the rounds;
*a second* counts answers, so there more is better. Times are of processor, which other work on the
machine disturbs little, or by the clock, which it lengthens: such lines say when it was busy.
"""
CIRCUMSTANCES = ("benchmark", "measured", "machine", "load")


@dataclass(frozen=True)
class Measured:
    """What is written about one benchmark."""

    name: str
    lines: tuple[str, ...]
    circumstances: str


def cores() -> int:
    """Processor cores this process may use."""
    return len(os.sched_getaffinity(0))


def circumstances(name: str, quick: bool, load: float) -> str:
    """One line: how much was measured, on what, and what else ran."""
    size = "small sizes" if quick else "full sizes"
    machine = (
        f"{cores()} cores, {platform.machine()}, {platform.system()}, "
        f"Python {platform.python_version()}"
    )
    return f"| {name} | {size} | {machine} | {load:.1f} running or waiting |"


def renewed(old: str, measured: Measured, order: Sequence[str]) -> str:
    """The page with the lines of one benchmark replaced; those of others stay as they are."""
    figures, machine = _kept(old, order)
    figures[measured.name] = list(measured.lines)
    machine[measured.name] = [measured.circumstances]
    return (
        f"{INTRODUCTION}\n{rows.table(_joined(figures, order))}\n\n## Measured on\n\n"
        f"{rows.headed(CIRCUMSTANCES, _joined(machine, order))}\n"
    )


def _kept(old: str, order: Sequence[str]) -> tuple[dict[str, list[str]], dict[str, list[str]]]:
    """Lines by benchmark of the two tables of a page."""
    figures, _, machine = old.partition("## Measured on")
    return _by_name(figures, order), _by_name(machine, order)


def _by_name(text: str, order: Sequence[str]) -> dict[str, list[str]]:
    lines = text.splitlines()
    return {name: [line for line in lines if line.startswith(f"| {name} |")] for name in order}


def _joined(lines: dict[str, list[str]], order: Sequence[str]) -> list[str]:
    return [line for name in order for line in lines.get(name, ())]
