"""A recheck as JSON and as text."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from fieldkit.detune.recheck_answer import (
    FAILED,
    UNSURE,
    WORKED,
    AsFound,
    PromisedMode,
    Recheck,
    RunningMode,
)
from fieldkit.detune.recheck_reasons import DIMENSIONS, name_of
from fieldkit.quantity import show
from fieldkit.sheet import documents, tables
from fieldkit.sheet.installing import Fold
from fieldkit.sheet.plain import Cells, paragraph, percent, table, with_doubt
from fieldkit.signal.modes import MeasuredMode
from fieldkit.workup.rechecking import Rechecked

Document = dict[str, Any]

NEXT_SHOWN = 3
VERDICTS = {WORKED: "worked", FAILED: "did_not_work", UNSURE: "cannot_say"}
CONFIRMED = (
    "The check tells of frequencies alone; strength, fatigue and the local code stay with the "
    "responsible piping engineer."
)


def document(found: Rechecked) -> Document:
    """Everything, SI units in the keys."""
    answer = found.answer
    return {
        "verdict": VERDICTS[answer.verdict],
        "because": answer.because,
        "measure_next": answer.measure_next or None,
        "fix": {
            "rank": found.fix.rank or None,
            "summary": answer.summary,
            "change": answer.change.as_json(),
        },
        "state": _state(found),
        "chance_before": answer.chance_before,
        "chance_now": answer.chance_now,
        "margin": answer.margin,
        "margin_measured": answer.margin_measured,
        "predicted": [_promised(mode) for mode in answer.promised],
        "unexplained": [
            {"frequency_hz": m.frequency_hz, "direction": m.direction} for m in answer.unexplained
        ],
        "modes": [_running(mode) for mode in answer.running],
        "bands": [
            {
                "name": band.name,
                "low_hz": band.low_hz,
                "high_hz": band.high_hz,
                "avoid_low_hz": band.avoid_low_hz,
                "avoid_high_hz": band.avoid_high_hz,
            }
            for band in answer.bands_measured
        ],
        "found": [vars(one) for one in answer.found],
        "ways": [{"way": name, "probability": share} for name, share in answer.ways],
        "reasons": [
            {"reason": r.name, "probability": r.probability, "says": r.says, "check": r.check}
            for r in answer.reasons
        ],
        "mended": _mended(answer),
        "next_fixes": documents.detune(answer.next_fixes)["fixes"] if answer.next_fixes else [],
        "effective_members": answer.effective_members,
        "recordings": [
            {"file": e.path.name, "channel": e.channel, "direction": e.direction, "at_m": e.at_m}
            for e in found.retaps.entries
        ],
        "warnings": list(answer.warnings),
    }


def _state(found: Rechecked) -> Document:
    state = found.state
    return {
        "fill": list(state.fill),
        "temperature_k": state.temperature_k,
        "pressure_pa": state.pressure_pa,
        "as_running": found.answer.same_state,
    }


def _mended(answer: Recheck) -> Document | None:
    fix = answer.mended
    if fix is None:
        return None
    return {"summary": fix.summary, "change": fix.change.as_json(), "chance": fix.chance}


def _promised(mode: PromisedMode) -> Document:
    measured = mode.measured
    return {
        "direction": mode.direction,
        "low_hz": mode.low_hz,
        "median_hz": mode.median_hz,
        "high_hz": mode.high_hz,
        "measured_hz": measured.frequency_hz if measured else None,
        "measured_sd_hz": measured.frequency_sd_hz if measured else None,
        "inside": mode.inside,
    }


def _running(mode: RunningMode) -> Document:
    return {
        "direction": mode.direction,
        "low_hz": mode.low_hz,
        "median_hz": mode.median_hz,
        "high_hz": mode.high_hz,
        "measured_hz": mode.measured_hz,
        "margin": mode.margin,
        "chance_clear": mode.chance_clear,
        "nearest": {"band": mode.band, "separation": mode.separation},
    }


def lines(found: Rechecked, fold: Fold = paragraph) -> list[str]:
    """Verdict first, then promised beside measured, as it runs now, reasons and what next."""
    answer, units = found.answer, found.work.job.units
    text = [*fold(verdict_words(answer), 0, ""), ""]
    text += fold(change_words(found), 0, "")
    text += ["", "Promised and measured in the re-tap, Hz", *table(*promised_cells(answer))]
    if answer.unexplained:
        text += fold(unexplained_words(answer.unexplained), 2, "")
    text += ["", *fold(running_title(answer), 0, ""), *table(*running_cells(answer))]
    if answer.found:
        text += ["", "What the re-tap says of the change, 5 to 95 %"]
        text += table(*found_cells(answer, units))
    text += _reasons(answer, fold)
    text += _next(answer, fold)
    text += tables.warnings(answer.warnings) if fold is paragraph else _minded(answer, fold)
    return [*text, "", *fold(CONFIRMED, 0, "")]


def verdict_words(answer: Recheck) -> str:
    """The verdict and its ground in one sentence or two."""
    said = f"{answer.verdict[0].upper()}{answer.verdict[1:]}: {answer.because}."
    return f"{said} Measure: {answer.measure_next}." if answer.measure_next else said


def change_words(found: Rechecked) -> str:
    """What was changed, and the chances."""
    answer = found.answer
    rank = f"Change {found.fix.rank}" if found.fix.rank else "The change"
    return (
        f"{rank}: {answer.summary}. Chance of success promised {percent(answer.chance_before)}, "
        f"by the re-tap {percent(answer.chance_now)}."
    )


def promised_cells(answer: Recheck) -> Cells:
    """Each mode as promised beside what was measured."""
    rows = []
    for mode in answer.promised:
        measured, doubt = _measured(mode.measured)
        word = {True: "inside", False: "OUTSIDE", None: "not seen"}[mode.inside]
        rows.append(
            (
                mode.direction,
                f"{mode.median_hz:.1f}",
                f"{mode.low_hz:.1f} to {mode.high_hz:.1f}",
                measured,
                doubt,
                word,
            )
        )
    return Cells(("direction", "promised", "5 to 95 %", "measured", "±", ""), rows)


def _measured(mode: MeasuredMode | None) -> tuple[str, str]:
    return with_doubt(mode.frequency_hz, mode.frequency_sd_hz, 2) if mode else ("-", "-")


def unexplained_words(modes: Sequence[MeasuredMode]) -> str:
    """Peaks that belong to nothing."""
    peaks = ", ".join(f"{mode.frequency_hz:.2f} Hz" for mode in modes)
    return f"Belongs to no mode of the span as found: {peaks}"


def running_title(answer: Recheck) -> str:
    """What the table of running modes shows."""
    how = (
        "as measured: it was tapped as it runs"
        if answer.same_state
        else "measured frequencies carried over from the re-tap"
    )
    return (
        f"As it runs now, {how}; {100 * answer.margin_measured:.0f} % to be kept by a measured "
        f"mode, {100 * answer.margin:.0f} % by one that was not seen, Hz"
    )


def running_cells(answer: Recheck) -> Cells:
    """Each mode as the pipe runs now."""
    rows = [
        (
            mode.direction,
            f"{mode.median_hz:.1f}",
            f"{mode.low_hz:.1f} to {mode.high_hz:.1f}",
            "not seen" if mode.measured_hz is None else f"{mode.measured_hz:.1f}",
            f"{100 * mode.separation:.0f} % {mode.band}",
            percent(mode.chance_clear),
        )
        for mode in answer.running
    ]
    return Cells(("direction", "runs at", "5 to 95 %", "tapped", "apart from", "clear"), rows)


def found_cells(answer: Recheck, units: str) -> Cells:
    """Everything the change brought, as drawn and as found."""
    rows = [
        (
            name_of(one, units),
            _shown(one.drawn, one, units),
            f"{_shown(one.low, one, units)} to {_shown(one.high, one, units)}",
            "yes" if one.informed else "no",
        )
        for one in answer.found
    ]
    return Cells(("", "as drawn", "as found", "informed"), rows)


def _shown(value: float, one: AsFound, units: str) -> str:
    if one.unit == "m":
        return f"{1e3 * value / 25.4:.1f} in" if units == "US" else f"{1e3 * value:.0f} mm"
    return show(value, DIMENSIONS[one.unit], units, 2)


def _reasons(answer: Recheck, fold: Fold) -> list[str]:
    if not answer.reasons:
        return []
    text = ["", "Why it is not as promised, most likely first"]
    for number, reason in enumerate(answer.reasons, start=1):
        text += fold(f"{percent(reason.probability)}: {reason.says}", 2, f"{number}. ")
        text += fold(f"check: {reason.check}", 5, "")
    return text


def _next(answer: Recheck, fold: Fold) -> list[str]:
    if answer.next_fixes is None:
        return []
    text = ["", "Next change, on the pipe as it is found"]
    if answer.mended is not None:
        mended = f"chance {percent(answer.mended.chance)}: {answer.mended.summary}, as was drawn"
        text += fold(mended, 2, "-  ")
    for fix in answer.next_fixes.fixes[:NEXT_SHOWN]:
        text += fold(f"chance {percent(fix.chance)}: {fix.summary}", 2, f"{fix.rank}. ")
        text += [line for caution in fix.cautions for line in fold(caution, 5, "- ")]
    if not answer.next_fixes.fixes:
        text += fold("no change was found that helps", 2, "")
    return text


def _minded(answer: Recheck, fold: Fold) -> list[str]:
    told = [line for text in answer.warnings for line in fold(text, 2, "! ")]
    return ["", "Mind", *told] if told else []
