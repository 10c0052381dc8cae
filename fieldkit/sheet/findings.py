"""Resonance or forced, severity, the next blow and contradictions: as JSON and as text."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from fieldkit.detune.contradictions import Contradiction
from fieldkit.detune.diagnosis import BandCheck, Diagnosis
from fieldkit.detune.next_blow import Blow, figure, place
from fieldkit.detune.severity import SCREENING_CAUTION, Screening
from fieldkit.detune.severity_lines import PSI_PA
from fieldkit.quantity import show
from fieldkit.sheet.plain import paragraph, percent
from fieldkit.workup.findings import Findings, RunningFindings

Document = dict[str, Any]
_DIMENSIONS = {"m/s": "velocity"}


def with_running(document: Document, found: Findings) -> Document:
    """The document of ``running`` with verdicts and screening under each recording."""
    recordings = [
        recording | _running(one)
        for recording, one in zip(document["recordings"], found.running, strict=True)
    ]
    return document | {
        "recordings": recordings,
        "measured_in_bands": [_band_check(check) for check in found.band_checks],
    }


def with_blows(document: Document, found: Findings | None) -> Document:
    """A document with further blows, and what contradicts the model."""
    return document | {
        "next_blows": [_blow(blow) for blow in found.blows] if found else [],
        "contradictions": [_contradiction(c) for c in found.contradictions] if found else [],
    }


def with_diagnosis(document: Document, found: Findings | None) -> Document:
    """The document of ``detune`` with the verdict on every strong running line."""
    told = [one for running in found.running for one in running.diagnoses] if found else []
    top = found.top if found else None
    return with_blows(document, found) | {
        "diagnosis": [_diagnosis(one) for one in told],
        "diagnosis_first": top.reason if top else None,
    }


def _running(found: RunningFindings) -> Document:
    return {
        "diagnosis": [_diagnosis(one) for one in found.diagnoses],
        "screening": [_screening(one) for one in found.screened.screenings],
        "screening_refused": found.screened.refused or None,
    }


def _diagnosis(one: Diagnosis) -> Document:
    mode, times = one.mode, one.amplification
    return {
        "frequency_hz": one.line.frequency_hz,
        "file": one.line.file,
        "direction": one.line.direction,
        "excitation": one.excitation,
        "verdict": one.verdict,
        "mode": {
            "frequency_hz": mode.hz,
            "low_hz": mode.frequency.low,
            "high_hz": mode.frequency.high,
            "direction": mode.direction,
            "origin": mode.origin,
            "damping_ratio": mode.damping.median if mode.damping_measured else None,
            "damping_low": mode.damping.low,
            "damping_high": mode.damping.high,
        }
        if mode
        else None,
        "frequency_ratio": times.ratio if times else None,
        "amplification": {"best": times.best, "low": times.low, "high": times.high}
        if times
        else None,
        "reason": one.reason,
        "measure_next": one.measure_next,
    }


def _band_check(check: BandCheck) -> Document:
    return {
        "frequency_hz": check.mode.hz,
        "direction": check.mode.direction,
        "origin": check.mode.origin,
        "band": check.band.name,
        "avoid_low_hz": check.band.avoid_low_hz,
        "avoid_high_hz": check.band.avoid_high_hz,
        "separation": check.band.separation(check.mode.hz),
        "inside": check.inside,
    }


def _screening(one: Screening) -> Document:
    return {
        "screening": one.criterion,
        "value": one.value,
        "unit": one.unit,
        "measure": one.measure,
        "limits": [{"name": limit.name, "value": limit.value} for limit in one.limits],
        "above": list(one.above),
        "at_hz": one.at_hz,
        "applies_to": one.applies_to,
        "source": f"{one.source} (from memory)" if one.from_memory else one.source,
        "note": one.note,
    }


def _blow(blow: Blow) -> Document:
    return {
        "at_m": blow.at_m,
        "direction": blow.direction,
        "state": blow.state,
        "about": blow.about,
        "relative_sd_before": blow.sd_before,
        "relative_sd_after": blow.sd_after,
        "chance_to_settle": blow.settles,
        "modes": [
            {
                "low_hz": mode.low_hz,
                "high_hz": mode.high_hz,
                "direction": mode.direction,
                "chance_to_show": mode.chance,
            }
            for mode in blow.modes
        ],
    }


def _contradiction(found: Contradiction) -> Document:
    return {
        "kind": found.kind,
        "frequency_hz": found.frequency_hz,
        "direction": found.direction,
        "what": found.text,
        "check": found.check,
    }


def diagnosis_lines(found: Findings) -> list[str]:
    """The verdict on each strong line, recording by recording."""
    said: list[str] = []
    for running in found.running:
        for one in told_diagnoses(running):
            said += paragraph(f"{diagnosis_words(one)}.", 2)
            said += paragraph(f"Next: {one.measure_next}.", 4)
    for check in found.band_checks:
        said += paragraph(f"{band_words(check)}.", 2)
    return ["", "Resonance or forced?", *said] if said else []


def told_diagnoses(running: RunningFindings) -> list[Diagnosis]:
    """The verdicts of a recording that name a mode or an excitation."""
    return [one for one in running.diagnoses if one.mode or one.excitation is not None]


def diagnosis_words(one: Diagnosis) -> str:
    """What a running line is, and which sensor saw it."""
    sensor = f"{one.line.direction} sensor: " if one.line.direction else ""
    return f"{sensor}{one.reason}"


def band_words(check: BandCheck) -> str:
    """A measured mode against its nearest band."""
    band, mode = check.band, check.mode
    direction = f"{mode.direction} " if mode.direction else ""
    where = "lies within" if check.inside else "lies outside"
    return (
        f"Measured: the {direction}mode at {mode.hz:.1f} Hz {where} {band.avoid_low_hz:.1f} to "
        f"{band.avoid_high_hz:.1f} Hz, {band.name} with the margin for measured frequencies"
    )


def severity_lines(found: Sequence[RunningFindings], units: str = "SI") -> list[str]:
    """Screening of every recording, or why there is none; each criterion told once."""
    refused = dict.fromkeys(one.screened.refused for one in found if one.screened.refused)
    said = [line for reason in refused for line in paragraph(f"{reason}.", 2)]
    criteria: dict[str, Screening] = {}
    for running in found:
        if running.screened.refused:
            continue
        said += paragraph(f"{running.file}{_direction(running)}", 2)
        for one in running.screened.screenings:
            said += paragraph(screening_words(one, units), 4, "- ")
        criteria |= {one.criterion: one for one in running.screened.screenings}
    if not said:
        return []
    sources = [
        line for one in criteria.values() for line in paragraph(criterion_words(one), 2, "- ")
    ]
    caution = paragraph(SCREENING_CAUTION, 2) if criteria else []
    return ["", "Severity, screening only", *said, *sources, *caution]


def _direction(running: RunningFindings) -> str:
    directions = {one.line.direction for one in running.diagnoses if one.line.direction}
    return f", {directions.pop()} sensor" if len(directions) == 1 else ""


def screening_summary(found: RunningFindings) -> str:
    """Which lines the level exceeds, in one sentence, or why it was not screened."""
    screened = found.screened
    if screened.refused:
        return f"Severity not screened: {screened.refused.partition('since ')[2]}"
    above = [f"{one.criterion} ({one.above[-1]})" for one in screened.screenings if one.above]
    said = f"above {', '.join(above)}" if above else "under every line it was held against"
    return f"Severity, screening only: {said}"


def screening_words(one: Screening, units: str = "SI") -> str:
    """Criterion, level, and where that lies among the lines."""
    at = f" at {one.at_hz:.1f} Hz" if one.at_hz is not None else ""
    level = f"{_shown(one.value, one.unit, units)} {one.measure}{at}"
    return f"{one.criterion}: {level}, {_among(one, units)}"


def _among(one: Screening, units: str) -> str:
    """The highest line that is exceeded and the lowest that is not."""
    above = [limit for limit in one.limits if limit.name in one.above][-1:]
    under = [limit for limit in one.limits if limit.name not in one.above][:1]
    said = [f"above {limit.name} {_shown(limit.value, one.unit, units)}" for limit in above]
    said += [f"under {limit.name} {_shown(limit.value, one.unit, units)}" for limit in under]
    return ", ".join(said) or "no line known"


def criterion_words(one: Screening) -> str:
    """What a criterion is for and where it comes from."""
    memory = ", figures from memory" if one.from_memory else ""
    note = f"; {one.note}" if one.note else ""
    return f"{one.criterion}: screening of {one.applies_to}{note} ({one.source}{memory})"


def _shown(value: float, unit: str, units: str) -> str:
    if unit == "Pa":
        return f"{value / 1e6:.2g} MPa" if units == "SI" else f"{value / PSI_PA:.0f} psi"
    return show(value, _DIMENSIONS[unit], units, 3)


BLOWS_TITLE = "Further blows, the most telling first (expected doubt, one standard deviation)"


def blow_lines(found: Findings | None, units: str = "SI") -> list[str]:
    """Further blows, ranked, with what each is expected to leave of the doubt."""
    if found is None or not found.blows:
        return []
    said = ["", BLOWS_TITLE]
    for number, text in enumerate(blow_words(found, units), start=1):
        said += paragraph(text, 2, f"{number}. ")
    return said


def blow_words(found: Findings | None, units: str = "SI") -> list[str]:
    """The most telling further blows, each in one sentence."""
    return [
        f"{place(blow, units=units)}: {blow.about}, {figure(blow.sd_before)} to "
        f"{figure(blow.sd_after)}{_settling(blow)}"
        for blow in (found.blows[:4] if found else ())
    ]


def _settling(blow: Blow) -> str:
    if blow.settles is None:
        return ""
    return f", settled with chance {percent(blow.settles)}"


def contradiction_lines(found: Findings | None) -> list[str]:
    """What the model does not account for, with what to check."""
    if found is None or not found.contradictions:
        return []
    said = ["", "What contradicts the model"]
    for text in contradiction_words(found):
        said += paragraph(text, 2, "- ")
    return said


def contradiction_words(found: Findings | None) -> list[str]:
    """What the model does not account for, each with what to check."""
    return [f"{one.text}. Check: {one.check}." for one in (found.contradictions if found else ())]


def detune_top(found: Findings | None) -> list[str]:
    """The first line of an answer: what the strongest line is."""
    top = found.top if found else None
    return [*paragraph(f"{top.reason}.", 0), ""] if top else []


def better_measurement(found: Findings | None, best: float, goal: float) -> list[str]:
    """Where no change is sure enough: the measurement that would help."""
    said = better_measurement_words(found, best, goal)
    return ["", *(line for text in said for line in paragraph(text, 0))] if said else []


def better_measurement_words(found: Findings | None, best: float, goal: float) -> list[str]:
    """The same in one sentence, or nothing."""
    if found is None or best >= goal or not found.next_measurement:
        return []
    return [f"To be surer before anything is bought: {found.next_measurement}."]
