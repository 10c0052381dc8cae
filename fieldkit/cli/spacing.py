"""``fieldkit span JOB --spacing``: how far apart equal supports may stand."""

from __future__ import annotations

from typing import Annotated, Any

import typer

from fieldkit.errors import Refusal

Asked = Annotated[
    bool,
    typer.Option("--spacing", help="Tell instead how far apart equal supports may stand."),
]
Spans = Annotated[
    int, typer.Option("--spans", help="Equal spans in a row, for --spacing.", min=2, max=10)
]
Kind = Annotated[
    str | None,
    typer.Option(
        "--support", metavar="KIND", help="Kind of the supports, for --spacing: as the job's own."
    ),
]
USUAL = 5


def answered(
    job: Any, progress: Any, spans: int, kind: str | None
) -> tuple[dict[str, Any], list[str]]:
    """Document and text; the supports are as stiff as the tap says, where there is one."""
    from fieldkit.sheet import spacing as told
    from fieldkit.workup.spacing import spacing

    spacing(job, kind=kind, spans=spans)
    found = spacing(job, _matched(job, progress), kind=kind, spans=spans)
    return told.document(found), told.lines(found, job.units)


def _matched(job: Any, progress: Any) -> Any:
    """The ensemble of the job's taps; None where there are none, or the model does not fit."""
    from fieldkit import workup

    if not (job.recordings or job.measured):
        return None
    try:
        evidence = workup.measured(job, progress)
        return workup.matching(job, evidence, workup.state_modes(job, progress), progress)
    except Refusal:
        return None
