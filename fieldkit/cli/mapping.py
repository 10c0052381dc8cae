"""``fieldkit detune JOB --map``: the chance of every place and size."""

from __future__ import annotations

from enum import StrEnum
from pathlib import Path
from typing import Annotated

import typer

from fieldkit.cli import output


class MapKind(StrEnum):
    """What is put on the pipe."""

    SUPPORT = "support"
    MASS = "mass"


class Held(StrEnum):
    """What a mapped support holds."""

    BOTH = "both"
    VERTICAL = "vertical"
    LATERAL = "lateral"


MapOption = Annotated[
    MapKind | None,
    typer.Option("--map", help="Instead: the chance at every station of every stiffness or mass."),
]
HeldOption = Annotated[Held, typer.Option("--holds", help="What a support on the map holds.")]


def answer(job_file: Path, kind: MapKind, held: Held, *, as_json: bool) -> None:
    """Count the map of a job and print it."""
    from fieldkit.detune.chance_map import chance_map
    from fieldkit.job.schema import load_job
    from fieldkit.sheet import chance
    from fieldkit.sheet.origin import marked
    from fieldkit.workup.chance import searched

    job = load_job(job_file)
    search, notes = searched(job, output.progress())
    found = chance_map(search, kind.value, held.value)
    output.clear_progress()
    lines = chance.lines(found, job.units, notes)
    document = dict(chance.document(found, notes))
    output.answer(*marked(document, lines, job.recordings), as_json=as_json)
