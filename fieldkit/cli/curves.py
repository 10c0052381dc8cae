"""``fieldkit detune JOB --fix N --curve KIND``: modes and chance along one size of a change."""

from __future__ import annotations

from enum import StrEnum
from typing import Annotated, Any

import typer

from fieldkit.cli import output
from fieldkit.errors import InputError


class CurveKind(StrEnum):
    """What is moved."""

    PLACE = "place"
    STIFFNESS = "stiffness"
    MASS = "mass"


CurveOption = Annotated[
    CurveKind | None,
    typer.Option("--curve", help="With --fix: modes and chance along one size of that change."),
]


def answer(work: Any, number: int | None, kind: CurveKind, *, as_json: bool) -> None:
    """Judge the change at every value and print it; InputError without a change that exists."""
    from fieldkit.sheet import curves
    from fieldkit.sheet.origin import marked
    from fieldkit.workup.curves import curve_of, curve_search

    fixes = {fix.rank: fix for fix in work.detuning.fixes}
    if number is None or number not in fixes:
        offered = f"give --fix from 1 to {len(fixes)}" if fixes else "nothing was found that helps"
        raise InputError(f"--curve needs a change, and there is no {number or '--fix'}", offered)
    search = curve_search(work.job, work.match)
    found = curve_of(work.job, search, fixes[number].change, kind.value, output.progress())
    output.clear_progress()
    notes = work.match.warnings if work.match else ()
    lines = [
        f"Change {number}: {fixes[number].summary}",
        *curves.lines(found, work.job.units, notes),
    ]
    document = dict(curves.document(found, number, notes))
    output.answer(*marked(document, lines, work.job.recordings), as_json=as_json)
