"""The match: measured beside computed, and what the measurement taught about each unknown."""

from __future__ import annotations

from fieldkit.sheet import findings, tables
from fieldkit.sheet.beyond import Results
from fieldkit.sheet.content import (
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

NO_MATCH = (
    "Nothing was matched: without measured modes every unknown stays at its usual value, and the "
    "changes rest on that. Tap the span, and add the recording to the job."
)


def match(found: Results) -> Section:
    """Pairs, unknowns before and after, contradictions, the next measurement."""
    work = found.work
    if work.match is None:
        return section("Match", paragraphs(work.refusals("match")) or [Paragraph(NO_MATCH)])
    matched = work.match
    blocks: list[Block] = [table("Measured and computed, Hz", tables.pair_cells(matched))]
    blocks += paragraphs([tables.unpaired_words(matched)] if matched.unpaired else [])
    cells = tables.parameter_cells(matched, work.job.units)
    blocks += [
        table(tables.UNKNOWNS_TITLE, cells),
        Paragraph(
            f"{len(matched.ensemble.weights)} models drawn from what is usual and weighed by the "
            f"measurement, worth {matched.ensemble.effective_size:.0f} independent ones. An "
            "unknown that was not informed keeps its usual interval: the measurement says nothing "
            "of it."
        ),
    ]
    against = findings.contradiction_words(work.findings)
    if against:
        blocks += [Heading("What contradicts the model"), *bullets(map(sentence, against))]
    blows = findings.blow_words(work.findings, work.job.units)
    if blows:
        blocks += [Heading(findings.BLOWS_TITLE), *bullets(map(sentence, blows))]
    blocks += paragraphs([f"Next: {matched.next_measurement}"])
    return section("Match", blocks)
