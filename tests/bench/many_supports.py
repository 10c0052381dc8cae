"""Workup time against the number of supports: ``python -m tests.bench.many_supports``.

A straight line in equal bays, every support of a stiffness that is not known, and the first peaks
typed in. Beside it one solve of the same line by scikit-fem.
"""

from __future__ import annotations

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

from collections.abc import Sequence

from fieldkit import workup
from fieldkit.job.document import Job
from fieldkit.job.schema import parse_job
from fieldkit.span.modes import span_modes
from tests.bench.asking import parser
from tests.bench.measuring import in_turn
from tests.bench.rows import Growth, Row, lines, table
from tests.bench.workups import straight_hz

BAY_M, ELEMENTS_PER_BAY, PEAKS = 4.0, 12, 3
HEAD = """
fieldkit = 1
title = "A line in equal bays"
[pipe]
size = "NPS 3"
schedule = "40"
material = "carbon steel"
[[excitation]]
name = "pump"
speed = ["1450 rpm", "1495 rpm"]
orders = [1, 2]
[goal]
up_to = "80 Hz"
"""


def growth(counts: Sequence[int]) -> list[Row]:
    """Once each, since the large ones take minutes."""
    costs = [_cost(count) for count in counts]
    ours, theirs = [ours for ours, _ in costs], [theirs for _, theirs in costs]
    against = f"one solve of the line by scikit-fem, {ELEMENTS_PER_BAY} elements a bay"
    return Growth("workup", counts, "supports", ours, theirs, against, "s of processor").rows()


def _cost(count: int) -> tuple[float, float]:
    job, elements = line(count), ELEMENTS_PER_BAY * (count - 1)
    works = {"ours": lambda: _answered(job), "theirs": lambda: straight_hz(job, elements=elements)}
    spent_s = in_turn(works, 1, warm=False)
    return float(spent_s["ours"][0]), float(spent_s["theirs"][0])


def _answered(job: Job) -> None:
    """Work it out; what is refused is not a time to be stated."""
    refused = workup.run(job).refused
    if refused:
        raise RuntimeError(f"{len(job.span.supports)} supports: {refused[0].reason}")


def line(count: int) -> Job:
    """So many supports, anchors at both ends, its first vertical frequencies typed in 3 % low."""
    job = parse_job(_text(count))
    modes = span_modes(job.span, job.tapped, job.goal.up_to_hz)
    first = [m.frequency_hz for m in modes if m.direction == "vertical"][:PEAKS]
    peaks = "".join(
        f"[[measured]]\nfrequency = {0.97 * hz:.4f}\nsd = {0.003 * hz:.4f}\ndamping = 0.01\n"
        'direction = "vertical"\nstate = "tapped"\n'
        for hz in first
    )
    return parse_job(_text(count) + peaks)


def _text(count: int) -> str:
    last = count - 1
    supports = "".join(
        f'[[support]]\nat = {BAY_M * i}\nkind = "{"clamp" if 0 < i < last else "anchor"}"\n'
        for i in range(count)
    )
    return f'{HEAD}[[leg]]\ndirection = "+x"\nlength = {BAY_M * last}\n{supports}'


def main() -> None:
    """Print the table."""
    asked = parser("tests.bench.many_supports", __doc__)
    asked.add_argument("counts", type=int, nargs="*", default=[2, 5, 10], help="supports")
    print(table(lines("supports", growth(asked.parse_args().counts), busy=False)))


if __name__ == "__main__":
    main()
