"""Bands, modes now, the chosen change and the runners-up with what each takes to install."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import zip_longest

from fieldkit.detune.install import Installation
from fieldkit.detune.verdict import Detuning, JudgedMode, Verdict
from fieldkit.sheet import findings, installing, tables
from fieldkit.sheet.beyond import Results, detailed
from fieldkit.sheet.content import (
    CAUTION,
    Block,
    Heading,
    Paragraph,
    Section,
    Table,
    bullets,
    paragraphs,
    section,
    sentence,
    table,
)
from fieldkit.sheet.order_response import HOW, times_text
from fieldkit.sheet.plain import percent, unwrapped
from fieldkit.workup.order_response import order_response

NO_BANDS = (
    "No band was held against the modes: name the excitation in the job, its speed range and orders"
)
NO_RESPONSE = (
    "How much less the pipe will move is not promised: the forces are not known. What is promised "
    "is that no natural frequency is left in a band; measure the level again after the change."
)


def bands(found: Results) -> Section:
    """What is to be kept clear, with the margin, and the modes beside it."""
    work = found.work
    detuning = work.detuning
    if detuning is None:
        why = work.refusals("detune") or (NO_BANDS,)
        return section("Bands and margin", paragraphs(why))
    goal = work.job.goal
    title = f"To stay clear of, with a margin of {100 * detuning.margin:.0f} %, Hz"
    blocks: list[Block] = [table(title, tables.band_cells(detuning.bands))]
    blocks.append(
        Paragraph(
            f"A predicted frequency is clear outside low x (1 - {detuning.margin:g}) to high x "
            f"(1 + {detuning.margin:g}); a measured one is held against {goal.margin_measured:g} "
            "in place of that (API 618, 5th edition, as two secondary texts give it: 20 % as "
            f"predicted, 10 % as measured). Modes above {goal.up_to_hz:g} Hz are left alone."
        )
    )
    now = f"Modes now, {detuning.state}, over the ensemble, Hz"
    blocks.append(table(now, tables.judged_cells(detuning.modes)))
    checks = work.findings.band_checks if work.findings else ()
    blocks += bullets(sentence(findings.band_words(check)) for check in checks)
    return section("Bands and margin", blocks)


def changes(found: Results) -> Section:
    """The first change and the next ones in full, all of them in a table."""
    work = found.work
    detuning = work.detuning
    if detuning is None or not detuning.fixes:
        nothing = NO_BANDS if detuning is None else "no change of the allowed kinds was found"
        why = work.refusals("detune") or (nothing,)
        return section("Changes", paragraphs(why))
    blocks: list[Block] = [_ranking(detuning)]
    told = detailed(detuning.fixes)
    common = _common(found, told)
    for verdict in told:
        blocks += _change(found, detuning, verdict, common)
    blocks += paragraphs(found.why_not("installation"))
    blocks.append(Heading("For every change"))
    blocks += bullets(map(sentence, common), CAUTION)
    blocks += _other_cures(detuning)
    blocks += [Heading("Expected response"), *_response(found, told), Paragraph(NO_RESPONSE)]
    return section("Changes", blocks)


def _response(found: Results, told: Sequence[Verdict]) -> list[Block]:
    """How strongly the pipe answers to each order, now and after each of these changes."""
    each = [order_response(found.work, verdict) for verdict in told]
    if not each[0]:
        return []
    rows = tuple(
        (
            orders[0].band.name,
            times_text(orders[0].now),
            *(times_text(order.after) for order in orders),
        )
        for orders in zip(*each, strict=True)
    )
    head = ("order", "now", *(f"after change {verdict.rank}" for verdict in told))
    title = "Amplification of a steady force, nearest mode, worst speed (5 to 95 %)"
    return [Table(title, head, rows, keyed=True), Paragraph(HOW)]


def _common(found: Results, told: Sequence[Verdict]) -> list[str]:
    """Cautions that hold for each of these changes: told once."""
    each = [_cautions(found, verdict) for verdict in told]
    return [text for text in each[0] if all(text in others for others in each)]


def _cautions(found: Results, verdict: Verdict) -> list[str]:
    parts = found.installs.get(verdict.rank, ())
    of_parts = [text for part in parts for text in part.cautions]
    return list(dict.fromkeys([*verdict.cautions, *of_parts]))


def _ranking(detuning: Detuning) -> Table:
    rows = tuple(
        (
            str(fix.rank),
            fix.summary,
            percent(fix.chance),
            ", ".join(f"{mode.median_hz:.1f}" for mode in fix.modes_after),
            tables.nearest_words(fix),
        )
        for fix in detuning.fixes
    )
    tried = f", the best of {detuning.tried:,} single changes tried" if detuning.tried else ""
    head = ("", "change", "chance", "modes after, Hz", "nearest band")
    return Table(f"Changes, best first{tried}", head, rows)


def _change(
    found: Results, detuning: Detuning, verdict: Verdict, common: Sequence[str]
) -> list[Block]:
    chosen = "the chosen change" if verdict.rank == 1 else "runner-up"
    blocks: list[Block] = [
        Heading(f"Change {verdict.rank}, {chosen}: {verdict.summary}"),
        Paragraph(f"Chance that every mode is clear: {percent(verdict.chance)}."),
        _before_and_after(detuning.modes, verdict.modes_after),
        *paragraphs([verdict.why, verdict.fails]),
    ]
    parts = found.installs.get(verdict.rank, ())
    for number, part in enumerate(parts, start=1):
        if len(parts) > 1:
            blocks.append(Paragraph(f"Part {number} of {len(parts)}:"))
        blocks += _installation(part, found.work.job.units)
    own = [text for text in _cautions(found, verdict) if text not in common]
    return blocks + bullets(map(sentence, own), CAUTION)


def _installation(part: Installation, units: str) -> list[Block]:
    blocks: list[Block] = []
    blocks += paragraphs(installing.stiffness_lines(part, units, unwrapped))
    if part.brackets and part.stiffness_n_per_m:
        blocks.append(
            table(installing.bracket_words(part, units), installing.bracket_cells(part, units))
        )
        blocks += paragraphs([installing.sections_words(part)])
    elif part.stiffness_n_per_m:
        blocks += paragraphs([installing.bracket_words(part, units)])
    if part.heat:
        blocks.append(table(installing.HEAT_TITLE, installing.heat_cells(part, units)))
    return blocks + paragraphs(installing.rest_lines(part, units, unwrapped))


def _before_and_after(now: Sequence[JudgedMode], after: Sequence[JudgedMode]) -> Table:
    """In order within each direction."""
    directions = list(dict.fromkeys(mode.direction for mode in (*now, *after)))
    rows = []
    for direction in directions:
        pairs = zip_longest(
            (mode for mode in now if mode.direction == direction),
            (mode for mode in after if mode.direction == direction),
        )
        rows += [(direction, _told(before), _told(then)) for before, then in pairs]
    head = ("direction", "now, Hz (5 to 95 %)", "after, Hz (5 to 95 %)")
    return Table("Modes now and after, in order within each direction", head, tuple(rows))


def _told(mode: JudgedMode | None) -> str:
    if mode is None:
        return "-"
    return f"{mode.median_hz:.1f} ({mode.low_hz:.1f} to {mode.high_hz:.1f})"


def _other_cures(detuning: Detuning) -> list[Block]:
    if not detuning.other_cures:
        return []
    blocks: list[Block] = [Heading("Living with it: these do not clear the bands")]
    for cure in detuning.other_cures:
        blocks += paragraphs([tables.other_cure_words(cure)])
        if cure.amplification_now and cure.amplification_after:
            blocks += paragraphs(
                [
                    f"amplification at resonance {cure.amplification_now:.3g} now, "
                    f"{cure.amplification_after:.3g} after"
                ]
            )
        blocks += bullets(map(sentence, cure.cautions), CAUTION)
    return blocks
