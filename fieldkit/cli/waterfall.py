"""``fieldkit running FILE --waterfall``: the strongest line against time."""

from __future__ import annotations

from typing import Annotated, Any

import typer

from fieldkit.cli import output

Asked = Annotated[
    bool, typer.Option("--waterfall", help="Instead: the strongest line against time.")
]


def answer(entries: Any, job: Any, up_to_hz: float, *, as_json: bool) -> None:
    """Read each recording and print how its strongest line moves."""
    from fieldkit.detune.excitation import bands
    from fieldkit.sheet import waterfall
    from fieldkit.sheet.origin import marked
    from fieldkit.workup.waterfall import waterfall_of

    orders = bands(job.excitations, 0.0) if job else ()
    found = [
        (entry.path.name, waterfall_of(entry, up_to_hz, output.progress())) for entry in entries
    ]
    output.clear_progress()
    document = {"waterfalls": [dict(waterfall.document(*one, orders)) for one in found]}
    lines: list[str] = []
    for one in found:
        lines += [*([""] if lines else []), *waterfall.lines(*one, orders)]
    output.answer(*marked(document, lines, entries), as_json=as_json)
