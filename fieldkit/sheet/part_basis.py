"""What the results rest on: assumptions, limits of the model, files and versions."""

from __future__ import annotations

from fieldkit import __version__
from fieldkit.detune import likelihood, unknowns
from fieldkit.detune.known_modes import ASSUMED_DAMPING, TAP_TO_RUNNING
from fieldkit.quantity import show
from fieldkit.sheet import advice
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
from fieldkit.span.axial import BUILT_AT_K
from fieldkit.steel import brackets

LIMITS = (
    "Linear beams: no ovalling or other shell modes of large thin pipe, and no local flexibility "
    "of branches beyond what a branch support holds",
    "No acoustics: pulsation in the contents and its resonances are not computed, only entered as "
    "excitation",
    "No gaps, no friction, no play: a support holds both ways with one stiffness",
    "No expansion joint without tie rods; the axial force of heat and pressure takes the line as "
    "closed or carried on beyond both ends",
    "What lies beyond the ends of the span is only what its end supports say",
    "Steel of supports counts as stiffness alone; its mass and its own resonances are left out",
    "Strength, fatigue and flexibility of the line are not checked; a screening of severity is no "
    "fatigue assessment",
)


def assumptions(found: Results) -> Section:
    """Everything that was assumed, with its size; then what is to be minded."""
    job = found.work.job
    warnings = advice.all_warnings(found.work)
    blocks: list[Block] = [Table("", ("what", "assumed"), tuple(_assumed(found)), keyed=True)]
    blocks += bullets(map(sentence, warnings), CAUTION)
    if not job.goal.keep_out_m:
        blocks += paragraphs(["no station was kept out: every change may go anywhere on the span"])
    return section("Assumptions", blocks)


def _assumed(found: Results) -> list[tuple[str, str]]:
    job = found.work.job
    by_schedule = "schedule" in job.span.pipe.label
    low, high = ASSUMED_DAMPING
    wall = (
        "mill tolerance, one-sided: mostly 0.96 to 1.00 of nominal (ASME B36.10M allows 12.5 % "
        "below, from memory)"
        if by_schedule
        else f"{100 * unknowns.MEASURED_WALL[1]:g} %, one standard deviation, as gauged"
    )
    return [
        ("support stiffness", "where not stated: usual for the kind of support, with its doubt "
         "(common practice, no source); see the table of supports"),
        ("length of each stretch", f"{100 * unknowns.LENGTH_SD:g} %, one standard deviation "
         "(common practice, no source)"),
        ("elastic modulus", f"{100 * unknowns.MODULUS_SD:g} %, one standard deviation (common "
         "practice, no source)"),
        ("wall", wall),
        ("masses", "as the job says, one standard deviation"),
        ("model error", f"{100 * likelihood.MODEL_ERROR:g} % of a frequency that no unknown "
         "accounts for (common practice, no source)"),
        ("damping", f"as measured; where none was measured {100 * low:g} to {100 * high:g} % of "
         "critical (from memory)"),
        ("tapped against running", "a mode runs at another amplitude than it was tapped at: known "
         f"no better than {100 * TAP_TO_RUNNING:g} % (common practice, no source)"),
        ("built at", f"{show(BUILT_AT_K, 'temperature', job.units)}: heat counts from there"),
        ("fill", "; ".join(_fill(found))),
        ("steel of brackets", f"E {show(brackets.MODULUS_PA, 'modulus', job.units)}; clamp "
         f"{show(brackets.CLAMP_N_PER_M, 'stiffness', job.units)} on a 4-inch pipe, base "
         f"{show(brackets.BASE_N_PER_M, 'stiffness', job.units)} (common practice, no source)"),
        ("kept out", ", ".join(
            f"{show(a, 'length', job.units)} to {show(b, 'length', job.units)}"
            for a, b in job.goal.keep_out_m) or "nothing"),
    ]  # fmt: skip


def _fill(found: Results) -> list[str]:
    job = found.work.job
    return [
        f"{state.name} {100 * state.fill[0]:.0f} %"
        if state.fill[0] == state.fill[1]
        else f"{state.name} anywhere from {100 * state.fill[0]:.0f} to {100 * state.fill[1]:.0f} %"
        for state in (job.tapped, job.running)
    ]


def limits(found: Results) -> Section:
    """What the model does not see."""
    blocks = bullets(map(sentence, LIMITS))
    blocks.append(Paragraph(advice.RESULTS_CAUTION, CAUTION))
    return section("Limits of the model", blocks)


def provenance(found: Results) -> Section:
    """Program, dates and the hash of every file that went in."""
    basis = found.basis
    facts = (
        ("program", program()),
        ("job file", f"{basis.job.name}, last changed {basis.job_date}"),
        ("sheet written", basis.written),
    )
    rows = tuple(
        (one.name, f"{one.size:,}" if one.sha256 else "-", one.sha256 or "cannot be read")
        for one in basis.inputs
    )
    return section(
        "Files and program",
        [
            Table("", ("", ""), facts, keyed=True),
            Table("Every input", ("file", "bytes", "sha-256"), rows),
            Paragraph("To check a file: sha256sum FILE."),
        ],
    )


def program() -> str:
    """Name and version."""
    return f"fieldkit {__version__}"
