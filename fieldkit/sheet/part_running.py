"""What the machine does to the pipe while it runs."""

from __future__ import annotations

from fieldkit.detune.excitation import Band
from fieldkit.detune.severity import SCREENING_CAUTION
from fieldkit.sheet import findings, tables
from fieldkit.sheet.beyond import Results
from fieldkit.sheet.content import (
    CAUTION,
    Block,
    Heading,
    Paragraph,
    Section,
    bullets,
    paragraphs,
    section,
    sentence,
    table,
)
from fieldkit.sheet.figure_spectra import running_figure
from fieldkit.workup import RunningReading
from fieldkit.workup.findings import RunningFindings

NO_RUNNING = (
    "No running recording was read, so nothing says how strong the vibration is or which lines it "
    "has. Record a minute while it shakes, and add the recording to the job."
)


def running(found: Results, bands: tuple[Band, ...]) -> Section:
    """Lines, level, verdicts and screening, recording by recording."""
    work = found.work
    blocks: list[Block] = []
    told = work.findings.running if work.findings else ()
    for number, reading in enumerate(work.running, start=1):
        blocks += _recording(found, reading, bands, number)
        blocks += _verdicts(told[number - 1], work.job.units) if number <= len(told) else []
    blocks += _criteria(told)
    blocks += paragraphs(work.refusals("running"))
    return section("While the machine runs", blocks or [Paragraph(NO_RUNNING)])


def _recording(
    found: Results, reading: RunningReading, bands: tuple[Band, ...], number: int
) -> list[Block]:
    job = found.work.job
    blocks: list[Block] = [
        running_figure(reading, bands, job.goal.up_to_hz, number),
        table(tables.level_words(reading, job), tables.running_cells(reading, job)),
    ]
    if reading.modes and reading.modes.modes:
        title = f"Natural frequencies seen running; {tables.RUNNING_CAUTION}"
        blocks.append(table(title, tables.seen_running_cells(reading.modes.modes)))
        refused = tables.refused_words(reading.modes.refused)
        blocks += bullets(sentence(f"not accepted as a mode: {text}") for text in refused)
    else:
        blocks += paragraphs([f"No natural frequencies from it: {reading.no_modes}"])
    return blocks + bullets(sentence(text) for text in tables.running_remarks(reading))


def _verdicts(told: RunningFindings, units: str) -> list[Block]:
    lines = findings.told_diagnoses(told)
    said = [f"{sentence(findings.diagnosis_words(one))} Next: {one.measure_next}." for one in lines]
    blocks: list[Block] = [Heading("Resonance or forced?"), *bullets(said)] if said else []
    if told.screened.refused:
        return blocks + paragraphs([told.screened.refused])
    screened = [findings.screening_words(one, units) for one in told.screened.screenings]
    if screened:
        blocks += [Heading("Severity, screening only"), *bullets(map(sentence, screened))]
    return blocks


def _criteria(told: tuple[RunningFindings, ...]) -> list[Block]:
    """Each criterion with its source, once."""
    criteria = {one.criterion: one for found in told for one in found.screened.screenings}
    if not criteria:
        return []
    sources = [sentence(findings.criterion_words(one)) for one in criteria.values()]
    return [
        Heading("Criteria of the screening"), *bullets(sources),
        Paragraph(SCREENING_CAUTION, CAUTION),
    ]  # fmt: skip
