"""A sheet of the made-up workup: no solver, no signal processing, quick."""

from __future__ import annotations

from dataclasses import replace
from datetime import datetime
from pathlib import Path

from fieldkit.detune.excitation import Excitation
from fieldkit.job.document import Job
from fieldkit.sheet.basis import basis_of
from fieldkit.sheet.beyond import Results
from fieldkit.sheet.compose import composed
from fieldkit.sheet.content import Bullets, Document, Figure, Heading, Paragraph, Table
from fieldkit.workup import Workup
from tests.ui import glycol

NOW = datetime(2026, 3, 4, 15, 30)
HOSTILE = (
    "<script>alert(1)</script><img src=http://x.test/a onerror=alert(2)>\x1b[31m\u202e[red]b[/red] "
    "$\\frac{1}{0}$ `c` *d* _e_ | [f](http://x.test) </svg> \" ' & {{ 7*7 }} #010101"
)


def job(**changes: object) -> Job:
    return glycol.job(Path("/plant/glycol/job.toml"), **changes)


def work(**changes: object) -> Workup:
    return glycol.workup(job(), **changes)


def document(of: Workup | None = None) -> Document:
    """The whole sheet, without what only a solver gives."""
    found = of or work()
    return composed(Results(found, basis_of(found.job, None, NOW)))


def hostile() -> Workup:
    """Everything that a person can name, named to do harm."""
    plain = job()
    named = replace(
        plain,
        title=HOSTILE,
        contents_name=HOSTILE,
        span=replace(
            plain.span, masses=tuple(replace(mass, name=HOSTILE) for mass in plain.span.masses)
        ),
        excitations=tuple(replace(one, name=HOSTILE) for one in plain.excitations)
        or (Excitation(HOSTILE, (20.0, 25.0)),),
        recordings=tuple(
            replace(entry, path=entry.path.with_name(f"<b>{entry.path.name}\x1b]0;x\x07"))
            for entry in plain.recordings
        ),
    )
    found = glycol.workup(named)
    detuning = found.detuning
    assert detuning is not None
    return replace(
        found,
        taps=tuple(
            replace(reading, file=HOSTILE, entry=entry)
            for reading, entry in zip(found.taps, named.recordings, strict=False)
        ),
        running=tuple(replace(reading, file=HOSTILE) for reading in found.running),
        simulated=(HOSTILE,),
        warnings=(HOSTILE,),
        detuning=replace(
            detuning,
            bands=tuple(replace(band, name=HOSTILE) for band in detuning.bands),
            fixes=tuple(replace(fix, summary=HOSTILE) for fix in detuning.fixes),
        ),
    )


def texts(of: Document) -> list[str]:
    """Every text of a sheet but those inside figures."""
    found = [of.title, *(value for _, value in of.facts), *of.notices]
    for section in of.sections:
        found.append(section.title)
        for block in section.blocks:
            found += _texts(block)
    return [text for text in found if text]


def _texts(block: object) -> list[str]:
    if isinstance(block, Paragraph | Heading):
        return [block.text]
    if isinstance(block, Bullets):
        return list(block.items)
    if isinstance(block, Figure):
        return [block.caption]
    assert isinstance(block, Table)
    return [block.title, *block.head, *(cell for row in block.rows for cell in row)]
