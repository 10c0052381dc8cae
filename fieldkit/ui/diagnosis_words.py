"""Verdicts and screening in the few cells a view has for them."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

from fieldkit.ui.words import DASH, hertz, sentence

if TYPE_CHECKING:
    from fieldkit.detune.diagnosis import Diagnosis
    from fieldkit.ui.desk import Desk
    from fieldkit.workup.findings import Findings

HEADINGS = {
    "resonance": "Resonance",
    "near": "Near resonance",
    "forced": "Forced",
    "cannot tell": "Cannot tell",
}


def in_short(one: Diagnosis) -> str:
    """``Resonance: 47.2 Hz on pump 2x, mode 46.3 Hz 1.9 % away: 26x (18–40)``."""
    on = f"on {one.excitation}" if one.excitation else "on no known order"
    start = f"{HEADINGS[one.verdict]}: {hertz(one.line.frequency_hz)} Hz {on}"
    if one.mode is None or one.apart is None or one.amplification is None:
        return f"{start}, {one.reason.rpartition('; ')[2].partition(',')[0]}"
    return f"{start}, mode {hertz(one.mode.hz)} Hz {100 * one.apart:.1f} % away: {times(one)}"


def times(one: Diagnosis) -> str:
    """``26x (18–40)``, or a dash."""
    from fieldkit.detune.diagnosis import figure

    found = one.amplification
    if found is None:
        return DASH
    low, high = figure(found.low), figure(found.high)
    return f"{figure(found.best)}x" + (f" ({low}–{high})" if low != high else "")


def first_part(text: str) -> str:
    """What to do, without the how and why behind it."""
    return re.split(r"[,;:]", text, maxsplit=1)[0]


def first_verdict(desk: Desk) -> Diagnosis | None:
    """The verdict of the whole job that matters most."""
    found = desk.workup.findings if desk.workup else None
    return found.top if found else None


def details(found: Findings, units: str) -> str:
    """Every verdict, every screening and where each criterion comes from, as paragraphs."""
    from fieldkit.detune.severity import SCREENING_CAUTION
    from fieldkit.sheet.findings import band_words, criterion_words, screening_words

    said: list[str] = []
    criteria: dict[str, str] = {}
    for running in found.running:
        for one in running.diagnoses:
            sensor = f" ({one.line.direction} sensor)" if one.line.direction else ""
            said += [f"{sentence(one.reason)}{sensor}", f"→ {sentence(one.measure_next)}", ""]
    said += [sentence(band_words(check)) for check in found.band_checks]
    for running in found.running:
        directions = {one.line.direction for one in running.diagnoses} - {None}
        heading = ", ".join(
            ("Severity, screening only", running.file, *sorted(map(str, directions)))
        )
        said += ["", heading]
        said += [f"- {screening_words(one, units)}" for one in running.screened.screenings]
        said += [sentence(running.screened.refused)] if running.screened.refused else []
        criteria |= {one.criterion: criterion_words(one) for one in running.screened.screenings}
    said += ["", *(sentence(words) for words in criteria.values())]
    return "\n".join([*said, "", SCREENING_CAUTION] if criteria else said)
