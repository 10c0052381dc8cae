"""The answer of a workup in plain words, for a person who has one minute."""

from __future__ import annotations

from fieldkit.sheet import findings, tables
from fieldkit.sheet.origin import mark
from fieldkit.sheet.plain import clean, paragraph, percent
from fieldkit.workup import Workup, simulated_notice

RESULTS_CAUTION = (
    "These figures support a judgement, they do not replace it: to be confirmed by the responsible "
    "piping engineer under the local code."
)


def lines(workup: Workup) -> list[str]:
    """The whole advice: question, answer, evidence, cautions."""
    found = [clean(workup.job.title), "=" * min(len(clean(workup.job.title)), 78), ""]
    found += mark(simulated_notice(workup.simulated))
    found += ["Is it a resonance?", *_resonance(workup), ""]
    found += ["What to change", *_cure(workup), ""]
    found += ["What it rests on", *_evidence(workup)]
    found += tables.warnings(_all_warnings(workup))
    found += ["", *paragraph(tables.TAP_CAUTION, 0), *paragraph(RESULTS_CAUTION, 0)]
    return found


def _resonance(workup: Workup) -> list[str]:
    detuning = workup.detuning
    if detuning is None:
        return _reasons(workup, "detune", "cannot be said")
    caught = [
        (mode, band)
        for mode in detuning.modes
        for band in detuning.bands
        if mode.chance_clear < 0.5 and band.holds(mode.median_hz)
    ]
    said = [
        line
        for mode, band in caught
        for line in paragraph(
            f"The {mode.direction} mode at {mode.median_hz:.1f} Hz ({mode.low_hz:.1f} to "
            f"{mode.high_hz:.1f} Hz, {detuning.state}) lies in reach of {band.name} "
            f"({_range(band.low_hz, band.high_hz)} Hz).",
            2,
        )
    ]
    said = said or ["  No computed mode is more likely in a band than out of it."]
    said += paragraph(f"Chance that every mode is clear now: {percent(detuning.chance_now)}.", 2)
    return said + _running_lines(workup)


def _running_lines(workup: Workup) -> list[str]:
    """The strongest running lines with their verdicts, and what the level exceeds."""
    said: list[str] = []
    for running in workup.findings.running if workup.findings else ():
        named = [one for one in running.diagnoses if one.mode or one.excitation]
        for one in named[:3]:
            sensor = f", {one.line.direction} sensor" if one.line.direction else ""
            said += paragraph(f"Running{sensor}: {one.reason}.", 2)
        said += paragraph(f"{findings.screening_summary(running)}.", 2)
    return said


def _cure(workup: Workup) -> list[str]:
    detuning = workup.detuning
    if detuning is None:
        return _reasons(workup, "detune", "cannot be said")
    if not detuning.fixes:
        return ["  No change of the allowed kinds was found."]
    best = detuning.fixes[0]
    goal = workup.job.goal.chance
    said = []
    if best.chance < goal:
        said += paragraph(
            f"No single change reaches the wanted chance of {percent(goal)}. The best found:", 2
        )
    said += tables.fix(best)
    said += findings.better_measurement(workup.findings, best.chance, goal)
    others = [f"chance {percent(fix.chance)}: {fix.summary}" for fix in detuning.fixes[1:4]]
    if others:
        said += ["", "  Else"]
        said += [line for other in others for line in paragraph(other, 4, "- ")]
    return said


def _evidence(workup: Workup) -> list[str]:
    said: list[str] = []
    measured, running = workup.evidence.firm, workup.evidence.running
    usable = sum(len(reading.records) for reading in workup.taps)
    if measured:
        listed = ", ".join(f"{mode.frequency_hz:.2f}" for mode in measured)
        said += paragraph(f"Measured: {listed} Hz, from {usable} usable taps.", 2)
    else:
        said += _reasons(workup, "tap", "nothing was tapped" if running else "nothing was measured")
    if running:
        seen = ", ".join(f"{mode.frequency_hz:.2f}" for mode in running)
        said += paragraph(f"Seen running: {seen} Hz; {tables.RUNNING_CAUTION}.", 2)
    if workup.match is not None:
        learnt = [p.name for p in workup.match.parameters if p.informed]
        source = "tap" if measured else "running record"
        said += paragraph(
            f"Matched: {len(workup.match.pairs)} of {len(workup.evidence.modes)} measured modes; "
            f"the {source} informed {', '.join(learnt) if learnt else 'none of the unknowns'}.",
            2,
        )
        said += paragraph(f"Next: {workup.match.next_measurement}.", 2)
    else:
        said += _reasons(workup, "match", "")
    for step in ("running", "span"):
        said += _reasons(workup, step, "")
    return said


def _reasons(workup: Workup, step: str, otherwise: str) -> list[str]:
    reasons = workup.refusals(step)
    if not reasons:
        return paragraph(f"{otherwise}.", 2) if otherwise else []
    return [line for reason in reasons for line in paragraph(reason, 2)]


def _all_warnings(workup: Workup) -> tuple[str, ...]:
    found = list(workup.warnings)
    found += workup.match.warnings if workup.match else ()
    found += workup.detuning.warnings if workup.detuning else ()
    return tuple(dict.fromkeys(found))


def _range(low_hz: float, high_hz: float) -> str:
    if high_hz - low_hz < 0.005:
        return f"{low_hz:.2f}"
    return f"{low_hz:.2f} to {high_hz:.2f}"
