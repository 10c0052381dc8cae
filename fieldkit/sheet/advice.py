"""The answer of a workup in plain words, for a person who has one minute."""

from __future__ import annotations

from collections.abc import Sequence

from fieldkit.detune.matched import Match
from fieldkit.detune.verdict import Detuning
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
    found += ["Is it a resonance?", *_wrapped(resonance(workup)), ""]
    found += ["What to change", *_cure(workup), ""]
    found += ["What it rests on", *_wrapped(evidence(workup))]
    found += tables.warnings(all_warnings(workup))
    found += ["", *paragraph(tables.TAP_CAUTION, 0), *paragraph(RESULTS_CAUTION, 0)]
    return found


def _wrapped(sentences: Sequence[str]) -> list[str]:
    return [line for text in sentences for line in paragraph(text, 2)]


def resonance(workup: Workup) -> list[str]:
    """Whether modes lie where the machine shakes, in sentences."""
    return [*reached(workup), *_running_lines(workup)]


def reached(workup: Workup) -> list[str]:
    """Which computed modes lie in a band, and the chance that none does."""
    detuning = workup.detuning
    if detuning is None:
        return reasons(workup, "detune", "cannot be said")
    caught = [
        (mode, band)
        for mode in detuning.modes
        for band in detuning.bands
        if mode.chance_clear < 0.5 and band.holds(mode.median_hz)
    ]
    said = [
        f"The {mode.direction} mode at {mode.median_hz:.1f} Hz ({mode.low_hz:.1f} to "
        f"{mode.high_hz:.1f} Hz, {detuning.state}) lies in reach of {band.name} "
        f"({_range(band.low_hz, band.high_hz)} Hz)."
        for mode, band in caught
    ]
    said = said or ["No computed mode is more likely in a band than out of it."]
    said.append(f"Chance that every mode is clear now: {percent(detuning.chance_now)}.")
    return said


def _running_lines(workup: Workup) -> list[str]:
    """The strongest running lines with their verdicts, and what the level exceeds."""
    said: list[str] = []
    for running in workup.findings.running if workup.findings else ():
        named = [one for one in running.diagnoses if one.mode or one.excitation]
        for one in named[:3]:
            sensor = f", {one.line.direction} sensor" if one.line.direction else ""
            said.append(f"Running{sensor}: {one.reason}.")
        said.append(f"{findings.screening_summary(running)}.")
    return said


def _cure(workup: Workup) -> list[str]:
    detuning = workup.detuning
    if detuning is None or not detuning.fixes:
        return _wrapped(no_cure(workup))
    best = detuning.fixes[0]
    goal = workup.job.goal.chance
    said = _wrapped(below_goal(workup))
    said += tables.fix(best)
    said += findings.better_measurement(workup.findings, best.chance, goal)
    others = other_changes(detuning)
    if others:
        said += ["", "  Else"]
        said += [line for other in others for line in paragraph(other, 4, "- ")]
    return said


def no_cure(workup: Workup) -> list[str]:
    """Why there is no change to offer; empty where there is one."""
    if workup.detuning is None:
        return reasons(workup, "detune", "cannot be said")
    if not workup.detuning.fixes:
        return ["No change of the allowed kinds was found."]
    return []


def below_goal(workup: Workup) -> list[str]:
    """That the best change is not sure enough, where it is not."""
    detuning, goal = workup.detuning, workup.job.goal.chance
    if detuning is None or not detuning.fixes or detuning.fixes[0].chance >= goal:
        return []
    return [f"No single change reaches the wanted chance of {percent(goal)}. The best found:"]


def other_changes(detuning: Detuning) -> list[str]:
    """The next best changes with their chances."""
    return [f"chance {percent(fix.chance)}: {fix.summary}" for fix in detuning.fixes[1:4]]


def evidence(workup: Workup) -> list[str]:
    """What was measured and what it taught, in sentences."""
    said: list[str] = []
    measured, running = workup.evidence.firm, workup.evidence.running
    usable = sum(len(reading.records) for reading in workup.taps)
    if measured:
        listed = ", ".join(f"{mode.frequency_hz:.2f}" for mode in measured)
        said.append(f"Measured: {listed} Hz, from {usable} usable taps.")
    else:
        said += reasons(workup, "tap", "nothing was tapped" if running else "nothing was measured")
    if running:
        seen = ", ".join(f"{mode.frequency_hz:.2f}" for mode in running)
        said.append(f"Seen running: {seen} Hz; {tables.RUNNING_CAUTION}.")
    if workup.match is not None:
        said += matched_words(workup, "tap" if measured else "running record", workup.match)
    else:
        said += reasons(workup, "match", "")
    for step in ("running", "span"):
        said += reasons(workup, step, "")
    return said


def matched_words(workup: Workup, source: str, match: Match) -> list[str]:
    """How much was matched, what was learnt, and what to measure next."""
    learnt = [p.name for p in match.parameters if p.informed]
    return [
        f"Matched: {len(match.pairs)} of {len(workup.evidence.modes)} measured modes; "
        f"the {source} informed {', '.join(learnt) if learnt else 'none of the unknowns'}.",
        f"Next: {match.next_measurement}.",
    ]


def reasons(workup: Workup, step: str, otherwise: str) -> list[str]:
    """Why a step has no answer."""
    found = list(workup.refusals(step))
    return found or ([f"{otherwise}."] if otherwise else [])


def all_warnings(workup: Workup) -> tuple[str, ...]:
    """Everything to mind, each once."""
    found = list(workup.warnings)
    found += workup.match.warnings if workup.match else ()
    found += workup.detuning.warnings if workup.detuning else ()
    return tuple(dict.fromkeys(found))


def _range(low_hz: float, high_hz: float) -> str:
    if high_hz - low_hz < 0.005:
        return f"{low_hz:.2f}"
    return f"{low_hz:.2f} to {high_hz:.2f}"
