"""What the description alone says: handbook estimate, computed modes with their mesh, weight."""

from __future__ import annotations

from fieldkit.quantity import show
from fieldkit.sheet import tables
from fieldkit.sheet.beyond import Results
from fieldkit.sheet.content import (
    FORMULA,
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
from fieldkit.span.mesh import MESH_ERROR
from fieldkit.workup import StateModes
from fieldkit.workup.convergence import Convergence

NO_STATES = "The span was not solved: describe legs and supports, and work the job out again"


def handbook(found: Results) -> Section:
    """The estimate of each state with formula, numbers put in and source."""
    blocks: list[Block] = []
    for entry in found.work.states:
        blocks.append(Heading(f"As {entry.state}"))
        if entry.handbook is None:
            blocks += paragraphs(tables.handbook_words(entry))
            continue
        estimate = entry.handbook
        blocks += [
            Table(
                "",
                ("", ""),
                (
                    ("first mode", f"{estimate.frequency_hz:.2f} Hz"),
                    ("bracket", f"{estimate.low_hz:.2f} to {estimate.high_hz:.2f} Hz"),
                    ("source", estimate.source),
                    ("notes", estimate.note or "none"),
                ),
                keyed=True,
            ),
            Paragraph(estimate.formula, FORMULA),
        ]
    blocks += paragraphs(found.work.refusals("span"))
    return section("Handbook estimate", blocks or [Paragraph(sentence(NO_STATES))])


def computed(found: Results) -> Section:
    """Finite-element modes of both states, their mesh, and whether a finer one changes them."""
    job = found.work.job
    blocks: list[Block] = []
    for entry in found.work.states:
        blocks += _of_state(found, entry)
    blocks += paragraphs(found.work.refusals("span"))
    if found.convergence:
        blocks.append(_mesh(found.convergence, job.units))
        blocks.append(
            Paragraph(
                "Beam elements with cubic shape functions, shear deformation and rotary inertia; "
                "nodes at every end, bend, support and mass, and as close together as keeps the "
                f"error of any frequency up to {job.goal.up_to_hz:g} Hz under "
                f"{100 * MESH_ERROR:g} %. Each state was solved again with every element cut in "
                "two or more."
            )
        )
    blocks += paragraphs(found.why_not("mesh"))
    blocks += bullets(sentence(note) for note in found.weight_notes)
    return section("Computed modes", blocks or [Paragraph(sentence(NO_STATES))])


def _of_state(found: Results, entry: StateModes) -> list[Block]:
    job = found.work.job
    title = f"As {entry.state}, every unknown at its usual value, before the match"
    cells = tables.computed_cells(entry, job.units)
    checked = next((one for one in found.convergence if one.state == entry.state), None)
    blocks: list[Block] = [
        _with_finer(table(title, cells), checked) if checked else table(title, cells)
    ]
    answer = found.weights.get(entry.state)
    if answer is not None:
        blocks.append(Paragraph(sentence(tables.static_words(job, answer))))
    return blocks


def _with_finer(shown: Table, checked: Convergence) -> Table:
    """The frequencies of the finer mesh beside those in use."""
    finer = [f"{hz:.2f}" for hz in checked.finer_hz]
    finer += ["-"] * (len(shown.rows) - len(finer))
    rows = tuple((*row, hz) for row, hz in zip(shown.rows, finer, strict=False))
    return Table(shown.title, (*shown.head, "Hz, finer mesh"), rows)


def _mesh(checked: tuple[Convergence, ...], units: str) -> Table:
    rows = tuple(
        (
            one.state,
            str(one.elements),
            show(one.longest_element_m, "length", units, 3),
            str(one.finer_elements) if one.finer_elements else one.refused,
            "-" if one.largest_change is None else f"{100 * one.largest_change:.4f} %",
        )
        for one in checked
    )
    head = ("state", "elements", "longest", "elements, finer", "largest change of a frequency")
    return Table("Mesh and its convergence", head, rows, keyed=True)
