"""``fieldkit detune JOB --fix N``: one change with all it takes to install it."""

from __future__ import annotations

from dataclasses import replace
from typing import Annotated, Any

import typer

from fieldkit.errors import InputError

FixNumber = Annotated[
    int | None,
    typer.Option(
        "--fix", metavar="N", help="Print what it takes to install the Nth change.", min=1
    ),
]
Reach = Annotated[
    str | None,
    typer.Option(
        "--reach",
        metavar="LENGTH",
        help="From steel or concrete to the pipe, for the brackets: '0.5 m' if left out.",
    ),
]
_FARTHEST_M = 4.0


def reach_m(text: str | None) -> float:
    """A reach in metres; InputError where it is none."""
    from fieldkit.quantity import parse, show
    from fieldkit.steel.brackets import LENGTHS_M, REACH_M

    if text is None:
        return REACH_M
    found = parse(text, "length")
    if not LENGTHS_M[0] <= found <= _FARTHEST_M:
        limits = f"{show(float(LENGTHS_M[0]), 'length')} to {show(_FARTHEST_M, 'length')}"
        raise InputError(f"no bracket reaches {text}", f"give --reach from {limits}")
    return found


def installed(
    work: Any, document: dict[str, Any], number: int | None, reach: float
) -> tuple[dict[str, Any], Any]:
    """The document of ``detune`` with ``install`` in its changes, and the installations by rank.

    Only the change of a ``number`` stays, where one is given; InputError where there is none.
    """
    from fieldkit.sheet.installing import with_installs
    from fieldkit.workup.installing import installing

    fixes = work.detuning.fixes
    if number is not None and number not in [fix.rank for fix in fixes]:
        offered = f"give --fix from 1 to {len(fixes)}" if fixes else "nothing was found that helps"
        raise InputError(f"there is no change {number}", offered)
    wanted = [fix for fix in fixes if number in (None, fix.rank)]
    installs = installing(work, wanted, reach)
    kept = [entry for entry in document["fixes"] if number in (None, entry["rank"])]
    return with_installs(document | {"fixes": kept}, installs), installs


def detailed(fix: int, work: Any, installs: Any) -> list[str]:
    """One change in full, as text."""
    from fieldkit.sheet import installing, tables

    verdict = next(verdict for verdict in work.detuning.fixes if verdict.rank == fix)
    return [
        *tables.fix(replace(verdict, cautions=())),
        "",
        *installing.lines(installs[fix], work.job.units),
    ]
