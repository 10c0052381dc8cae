"""``fieldkit how VIEW``: how the numbers of a view are computed, each with its source."""

from __future__ import annotations

from enum import StrEnum
from typing import Annotated

import typer

from fieldkit.cli import output

EXAMPLE = "Example: fieldkit how detune"


class View(StrEnum):
    """What shows numbers."""

    TAP = "tap"
    RUNNING = "running"
    SPAN = "span"
    MATCH = "match"
    DETUNE = "detune"


def register(app: typer.Typer) -> None:
    """Add ``how``."""
    app.command(epilog=EXAMPLE)(how)


def how(
    view: Annotated[View, typer.Argument(help="Whose numbers.")],
    as_json: Annotated[bool, typer.Option("--json", help="Print one JSON document.")] = False,
) -> None:
    """Tell how each number is computed and where the method is published."""
    with output.answering(as_json=as_json):
        from fieldkit.sheet import how as told
        from fieldkit.sheet.plain import paragraph

        lines = [
            line
            for text in told.how(view.value)
            for line in (paragraph(text.strip(), 2 if text.startswith(" ") else 0) or [""])
        ]
        output.answer({"methods": told.document(view.value)}, lines, as_json=as_json)
