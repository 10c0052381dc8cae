"""Equal spacing of supports, as JSON and as text."""

from __future__ import annotations

import math
from typing import Any

from fieldkit.detune.spacing import CurvePoint, Held, SpacingAnswer
from fieldkit.quantity import show
from fieldkit.sheet.installing import Fold
from fieldkit.sheet.plain import paragraph, table

Document = dict[str, Any]
BAR = 20
SHOWN = 16
BASIS = (
    "Level pipe with contents and insulation, running, on equal spans; valves, bends and other "
    "ends are left out, and so is the force of heat along the pipe."
)
ALWAYS = (
    "To be confirmed by the responsible piping engineer under the local code: weight, flexibility "
    "and the supports themselves."
)


def document(found: SpacingAnswer) -> Document:
    """The answer with its curve, SI units in the keys."""
    weight = found.weight_based
    return {
        "spacing": {
            "state": found.state,
            "spans": found.spans,
            "supports": {
                "kind": found.supports.kind,
                "source": found.supports.source,
                "vertical": _held(found.supports.vertical),
                "lateral": _held(found.supports.lateral),
            },
            "clear_above_hz": found.top_hz,
            "chosen_m": found.chosen_m,
            "above_m": found.above_m,
            "above_with_soft_supports_m": found.above_soft_m,
            "above_with_rigid_supports_m": found.above_rigid_m,
            "between_bands_m": found.between_m,
            "by_spans": [{"spans": n, "above_m": at} for n, at in found.by_spans],
            "weight_based": None
            if weight is None
            else {
                "size": weight.size,
                "water_m": weight.water_m,
                "gas_m": weight.gas_m,
                "this_line_m": found.weight_based_m,
                "source": weight.source,
            },
            "curve": [_point(point) for point in found.curve],
        },
        "warnings": warnings(found),
    }


def _held(held: Held) -> Document:
    return {
        "median_n_per_m": held.median_n_per_m,
        "low_n_per_m": held.low_n_per_m,
        "high_n_per_m": held.high_n_per_m,
    }


def _point(point: CurvePoint) -> Document:
    return {
        "spacing_m": point.spacing_m,
        "frequency_hz": point.frequency_hz,
        "low_hz": point.low_hz,
        "high_hz": point.high_hz,
        "direction": point.direction,
        "clear": point.clear,
    }


def lines(found: SpacingAnswer, units: str, fold: Fold = paragraph, bar: int = BAR) -> list[str]:
    """What to choose, the curve as bars ``bar`` wide, what it rests on."""
    return [
        *fold(_choice(found, units), 0, ""),
        "",
        f"First natural frequency of {found.spans} equal spans, {found.state}, Hz",
        *curve_lines(found, units, bar),
        "",
        *(line for text in _notes(found, units) for line in fold(text, 0, "")),
        *(line for text in warnings(found) for line in fold(text, 2, "! ")),
    ]


def _choice(found: SpacingAnswer, units: str) -> str:
    if found.top_hz is None:
        return "The job names no excitation below its limit: nothing to stay clear of."
    edge = f"{found.top_hz:.1f} Hz, the upper edge of the highest band with its margin"
    if found.above_m is not None:
        text = (
            f"A support every {_at(found.above_m, units)} or less keeps the first frequency above "
            f"{edge}."
        )
        if found.above_m >= found.curve[-1].spacing_m:
            text += " That is the longest spacing looked at."
        return text
    text = f"No equal spacing with these supports keeps the first frequency above {edge}."
    if found.above_rigid_m is not None:
        text += f" Supports that do not give would: every {_at(found.above_rigid_m, units)}."
    if found.between_m is not None:
        text += (
            f" At {_at(found.between_m, units)} every mode lies between or below the bands: "
            "narrow, and lost when the supports are stiffer or softer."
        )
    return text


def curve_lines(found: SpacingAnswer, units: str, bar: int = BAR) -> list[str]:
    """A row for every few spacings, and one for the chosen: frequency as a bar, the edge marked."""
    rows = shown_points(found)
    top = max(point.high_hz for point in rows)
    low = min(point.low_hz for point in rows)

    def place(hz: float) -> int:
        return round((bar - 1) * math.log(hz / low) / math.log(top / low)) if top > low else 0

    return table(
        ("every", "Hz", "5 to 95 %", "", ""),
        [
            (
                _short(point.spacing_m, units),
                f"{point.frequency_hz:.1f}",
                f"{point.low_hz:.1f} to {point.high_hz:.1f}",
                _bar(place, point, found.top_hz, low, top, bar),
                mark,
            )
            for point, mark in marked_points(found, rows)
        ],
    )


def shown_points(found: SpacingAnswer) -> list[CurvePoint]:
    """Every few points of the curve."""
    step = max(1, len(found.curve) // SHOWN)
    return list(found.curve[::step])


def marked_points(found: SpacingAnswer, rows: list[CurvePoint]) -> list[tuple[CurvePoint, str]]:
    """Rows with whether they are clear, and what falls between each and the next."""
    marks = [
        (found.above_m, "chosen"),
        (found.weight_based_m, "by weight"),
        (found.between_m if found.above_m is None else None, "between"),
    ]
    out = []
    for i, row in enumerate(rows):
        end = rows[i + 1].spacing_m if i + 1 < len(rows) else math.inf
        told = [text for at, text in marks
                if at is not None and row.spacing_m <= at < end]  # fmt: skip
        clear = "clear" if row.clear else ""
        out.append((row, f"{clear} ◀ {', '.join(told)}".strip() if told else clear))
    return out


def _bar(
    place: Any, point: CurvePoint, edge: float | None, low: float, top: float, width: int
) -> str:
    """From soft to stiff supports as a line, the median as a block, the edge as a bar."""
    cells = [" "] * width
    for i in range(place(point.low_hz), place(point.high_hz) + 1):
        cells[i] = "─"
    if edge is not None and low <= edge <= top:
        cells[place(edge)] = "│"
    cells[place(point.frequency_hz)] = "█"
    return "".join(cells)


def _notes(found: SpacingAnswer, units: str) -> list[str]:
    rows = found.supports
    source = "as the tap found this job's" if rows.source == "tap" else "as is usual, not measured"
    vertical, lateral = (
        show(held.median_n_per_m, "stiffness", units, 2) for held in (rows.vertical, rows.lateral)
    )
    notes = [f"Supports: {rows.kind}, {vertical} vertical, {lateral} lateral, {source}."]
    if found.above_m is not None:
        soft = _at(found.above_soft_m, units) if found.above_soft_m else "no spacing looked at"
        notes.append(f"With supports as soft as one in twenty is: {soft}.")
    spread = [at for _, at in found.by_spans if at is not None]
    if spread and found.above_m is not None:
        notes.append(
            f"From {found.by_spans[0][0]} to {found.by_spans[-1][0]} spans: "
            f"{_at(min(spread), units)} to {_at(max(spread), units)}."
        )
    if found.weight_based is not None and found.weight_based_m is not None:
        duty = "liquid" if found.liquid else "gas"
        notes.append(
            f"By weight, {found.weight_based.size} {duty}: {_at(found.weight_based_m, units)} "
            f"({found.weight_based.source}); a rule for sag, not for vibration."
        )
    return [*notes, BASIS, ALWAYS]


def warnings(found: SpacingAnswer) -> list[str]:
    """What to mind about the answer."""
    said = []
    limit, chosen = found.weight_based_m, found.chosen_m
    if limit is not None and chosen is not None and chosen > limit:
        said.append(
            f"vibration would allow {chosen:.2f} m, more than the weight-based {limit:.2f} m: the "
            "shorter of the two governs"
        )
    if found.supports.source == "prior" and found.top_hz is not None:
        said.append(
            "nobody has measured supports of this kind here: the stiffness is a guess over a "
            "decade or two; tap the line, or build one support and tap that"
        )
    return said


def _short(length_m: float, units: str) -> str:
    return f"{length_m / 0.3048:.1f} ft" if units == "US" else f"{length_m:.2f} m"


def _at(length_m: float, units: str) -> str:
    return show(length_m, "length", units, 3) if units == "US" else f"{length_m:.2f} m"
