"""``fieldkit recheck JOB AFTER...``: did the change that was installed do what was promised?"""

from __future__ import annotations

from enum import StrEnum
from pathlib import Path
from typing import Annotated

import typer

from fieldkit.cli import output

EXAMPLE = (
    "Example: fieldkit recheck samples/glycol-booster/job.toml "
    "after/tap-vertical.flac after/tap-lateral.flac --fix 4"
)


class RetapState(StrEnum):
    """How the pipe was when it was recorded again."""

    TAPPED = "tapped"
    RUNNING = "running"


def register(app: typer.Typer) -> None:
    """Add ``recheck``."""
    app.command(epilog=EXAMPLE)(recheck)


def recheck(
    job_file: Annotated[
        Path, typer.Argument(metavar="JOB", help="Job file (TOML) as it was before the change.")
    ],
    files: Annotated[
        list[Path],
        typer.Argument(metavar="AFTER", help="Tap recordings made after the change."),
    ],
    as_json: Annotated[bool, typer.Option("--json", help="Print one JSON document.")] = False,
    number: Annotated[
        int, typer.Option("--fix", metavar="N", help="The change that was installed.", min=1)
    ] = 1,
    before: Annotated[
        Path | None,
        typer.Option(
            "--before",
            metavar="OLD.toml",
            help="The job before the change; JOB then is the one with the change in it.",
        ),
    ] = None,
    like: Annotated[
        list[int] | None,
        typer.Option(
            "--like", metavar="N", help="Each AFTER is set up as the Nth recording of the job."
        ),
    ] = None,
    fill: Annotated[
        float | None, typer.Option("--fill", help="Filled share of the bore, 0 to 1, as re-tapped.")
    ] = None,
    state: Annotated[
        RetapState, typer.Option("--state", help="State of the job it was re-tapped in.")
    ] = RetapState.TAPPED,
    running: Annotated[
        bool, typer.Option("--running", help="AFTER was recorded running: weaker than a tap.")
    ] = False,
) -> None:
    """Hold an installed change against recordings made after it."""
    with output.answering(as_json=as_json):
        from fieldkit import workup
        from fieldkit.job.schema import load_job
        from fieldkit.sheet import recheck as told
        from fieldkit.sheet.origin import marked
        from fieldkit.workup import rechecking
        from fieldkit.workup.retaps import retaps, state_of_retap

        job = load_job(before or job_file)
        built = load_job(job_file) if before else None
        as_state = state_of_retap(job, fill, "running" if running else state.value)
        found = retaps(job, files, "running" if running else "tap", like or ())
        progress = output.progress()
        work = workup.run(job, progress.within(0.0, 0.5))
        later = progress.within(0.5, 1.0)
        fix = (
            rechecking.built_fix(work, built, later)
            if built
            else rechecking.promised_fix(work, number)
        )
        answer = rechecking.rechecked(work, fix, found, as_state, later)
        output.clear_progress()
        document, lines = told.document(answer), told.lines(answer)
        output.answer(*marked(document, lines, answer.entries), as_json=as_json)
