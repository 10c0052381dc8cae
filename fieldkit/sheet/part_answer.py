"""The question and the answer, on top of a sheet."""

from __future__ import annotations

from fieldkit.detune.verdict import Detuning
from fieldkit.sheet import advice, findings, tables
from fieldkit.sheet.beyond import Results
from fieldkit.sheet.content import (
    CAUTION,
    Block,
    Paragraph,
    Section,
    Table,
    bullets,
    paragraphs,
    section,
    sentence,
)
from fieldkit.sheet.figure_bands import bands_figure
from fieldkit.sheet.plain import percent

QUESTION = (
    "Does this pipe shake because a natural frequency lies where the machine excites it, and what "
    "is the smallest change that takes it out?"
)


def answer(found: Results) -> Section:
    """Resonance, what excites it, the change and its chance; then what that rests on."""
    work = found.work
    blocks: list[Block] = [Paragraph(QUESTION)]
    blocks.append(Table("", ("question", "answer"), tuple(_rows(found)), keyed=True))
    if work.detuning is not None and work.detuning.bands:
        blocks.append(bands_figure(work.detuning, work.evidence.modes, work.job.goal.up_to_hz))
    blocks += bullets(dict.fromkeys([*advice.reached(work), *advice.evidence(work)]))
    blocks += paragraphs(
        findings.better_measurement_words(work.findings, _best_chance(found), work.job.goal.chance)
    )
    blocks += paragraphs([tables.TAP_CAUTION, advice.RESULTS_CAUTION], CAUTION)
    return section("Question and answer", blocks)


def _best_chance(found: Results) -> float:
    detuning = found.work.detuning
    return detuning.fixes[0].chance if detuning and detuning.fixes else 0.0


def _rows(found: Results) -> list[tuple[str, str]]:
    work = found.work
    top = work.findings.top if work.findings else None
    rows = [
        ("Is it a resonance?", sentence(top.reason if top else advice.reached(work)[0])),
    ]
    detuning = work.detuning
    if detuning is not None:
        rows.append(("Chance that every mode is clear now", percent(detuning.chance_now)))
    if detuning is None or not detuning.fixes:
        return [*rows, ("What to change", " ".join(map(sentence, advice.no_cure(work))))]
    return rows + _change(found, detuning)


def _change(found: Results, detuning: Detuning) -> list[tuple[str, str]]:
    best, goal = detuning.fixes[0], found.work.job.goal.chance
    after = ", ".join(f"{mode.median_hz:.1f}" for mode in best.modes_after)
    return [
        ("What to change", " ".join([*advice.below_goal(found.work), sentence(best.summary)])),
        (
            "Chance that every mode is then clear",
            f"{percent(best.chance)}, wanted {percent(goal)}",
        ),
        ("Modes after it", f"{after} Hz; {tables.nearest_words(best)}"),
        ("Why it works", sentence(best.why)),
        ("What would make it fail", sentence(best.fails)),
    ]
