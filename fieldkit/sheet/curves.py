"""The curves of a change as a document, as a table, and in words."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from fieldkit.detune.curves import FixCurve
from fieldkit.quantity import show
from fieldkit.sheet.chance import SHADES, ZONE
from fieldkit.sheet.plain import paragraph, percent

KEYS = {"place": "station_m", "stiffness": "stiffness_n_per_m", "mass": "mass_kg"}
ROWS, SHOWN_MODES = 13, 4
SHORT = {"vertical": "vert", "lateral": "lat", "axial": "ax", "vertical+lateral": "v+l"}


def document(found: FixCurve, number: int, warnings: Sequence[str] = ()) -> Mapping[str, Any]:
    """Everything on the curve: one entry per value."""
    own = found.varied
    return {
        "fix": number,
        "curve": own.kind,
        "what": own.what,
        KEYS[own.kind]: own.value.tolist(),
        "drawn": float(own.value[own.drawn]),
        "wanted": found.wanted,
        "chance": np.round(found.chance, 4).tolist(),
        "kept": [list(stretch) for stretch in found.kept],
        "kept_out": found.kept_out.tolist(),
        "changes": [change.as_json() for change in own.changes],
        "modes": [
            [
                {
                    "median_hz": mode.median_hz,
                    "low_hz": mode.low_hz,
                    "high_hz": mode.high_hz,
                    "direction": mode.direction,
                    "chance_clear": mode.chance_clear,
                }
                for mode in modes
            ]
            for modes in found.modes
        ],
        "nearest": [
            {"band": one.band, "separation": one.separation} if one else None
            for one in found.nearest
        ],
        "warnings": list(warnings),
    }


def headline(found: FixCurve) -> str:
    """What is moved."""
    return f"Modes and chance against the {found.varied.what}"


def value_text(found: FixCurve, i: int, units: str) -> str:
    """A value in the units of the job."""
    return size_text(found.varied.kind, float(found.varied.value[i]), units)


def size_text(kind: str, value: float, units: str) -> str:
    """A station, a stiffness or a mass, as many digits as a tape, a bracket or a scale gives."""
    if kind == "place":
        return show(value, "length", units, 3) if units == "US" else f"{value:.2f} m"
    if kind == "stiffness":
        return show(value, "stiffness", units, 2)
    return show(value, "mass", units, 2)


def read_out(found: FixCurve, i: int, units: str) -> str:
    """One value in a line: its chance, what is nearest, and how it was drawn."""
    nearest = found.nearest[i]
    beside = f", nearest {nearest.band} {percent(nearest.separation)} apart" if nearest else ""
    barred = ", kept out here" if found.kept_out[i] else ""
    said = (
        f"{value_text(found, i, units)}: {percent(float(found.chance[i]))} chance{beside}{barred}"
    )
    drawn = found.varied.drawn
    if i == drawn:
        return f"{said} (as drawn)"
    return f"{said} (drawn: {percent(float(found.chance[drawn]))})"


def modes_text(found: FixCurve, i: int, most: int = 4) -> str:
    """The modes at a value, each with its doubt, and ``!`` where one is likely in a band."""
    return " · ".join(
        f"{number}{'' if mode.chance_clear >= found.wanted else '!'} {mode.median_hz:.1f} "
        f"({mode.low_hz:.1f}–{mode.high_hz:.1f}) {SHORT.get(mode.direction, mode.direction)}"
        for number, mode in enumerate(found.modes[i][:most], start=1)
    )


def kept_text(found: FixCurve, units: str) -> str:
    """Between which values the wanted chance is kept."""
    kind, stretches = found.varied.kind, found.kept
    if not stretches:
        best = int(np.argmax(np.where(found.kept_out, -1.0, found.chance)))
        reached = percent(float(found.chance[best]))
        return (
            f"{percent(found.wanted)} is reached nowhere; the best is {reached} at "
            f"{value_text(found, best, units)}."
        )
    told = [
        size_text(kind, low, units)
        if low == high
        else f"{size_text(kind, low, units)} to {size_text(kind, high, units)}"
        for low, high in stretches
    ]
    return f"{percent(found.wanted)} is kept at {' and at '.join(told)}."


def shade(found: FixCurve, i: int) -> str:
    """The chance at a value as one character, as on the chance map."""
    if found.chance[i] >= found.wanted:
        return ZONE
    return next(glyph for top, glyph in SHADES if found.chance[i] <= top)


def lines(found: FixCurve, units: str, warnings: Sequence[str] = ()) -> list[str]:
    """The curve for a terminal without the app."""
    shown = _shown(found)
    rows = [_cells(found, i, units) for i in shown]
    head = [found.varied.kind, "chance", "", *(f"mode {m + 1}, Hz" for m in range(SHOWN_MODES))]
    width = [max(len(row[c]) for row in [head, *rows]) for c in range(len(head))]
    table = [
        "  ".join(cell.ljust(w) for cell, w in zip(row, width, strict=True)).rstrip()
        for row in [head, *rows]
    ]
    bands = ", ".join(
        f"{band.name} {band.avoid_low_hz:.1f}–{band.avoid_high_hz:.1f}" for band in found.bands
    )
    said = [
        *paragraph(headline(found), 0),
        *paragraph(f"Keep out of {bands} Hz", 0),
        "",
        *table,
        "",
    ]
    said += paragraph(kept_text(found, units), 0)
    said += ["* as drawn   ! may be in a band   " + f"{ZONE} {percent(found.wanted)} and more"]
    return said + [line for text in warnings for line in paragraph(text, 2, "! ")]


def _shown(found: FixCurve) -> list[int]:
    """Evenly spread values, the drawn one among them."""
    spread = np.rint(np.linspace(0, len(found.chance) - 1, ROWS)).astype(int).tolist()
    return sorted({*spread, found.varied.drawn})


def _cells(found: FixCurve, i: int, units: str) -> list[str]:
    mark = "*" if i == found.varied.drawn else ""
    modes = [
        f"{'' if m.chance_clear >= found.wanted else '!'}{m.low_hz:.1f}–{m.high_hz:.1f}"
        for m in found.modes[i][:SHOWN_MODES]
    ]
    return [
        f"{value_text(found, i, units)}{mark}",
        percent(float(found.chance[i])),
        "kept out" if found.kept_out[i] else shade(found, i),
        *modes,
        *[""] * (SHOWN_MODES - len(modes)),
    ]
