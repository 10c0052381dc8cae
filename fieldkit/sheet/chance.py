"""The chance map as a document, as a picture of characters, and in words."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.chance_map import ChanceMap
from fieldkit.quantity import show
from fieldkit.sheet.plain import paragraph, percent

SHADES = ((0.02, " "), (0.25, "·"), (0.5, "░"), (0.75, "▒"), (1.0, "▓"))
"""Up to this chance; the wanted chance and more is ZONE."""
ZONE, CURVE, KEPT_OUT, CURSOR = "█", "•", "╱", "X"
ROWS, COLUMNS = 18, 64
Where = NDArray[np.intp]


def document(found: ChanceMap, warnings: Sequence[str] = ()) -> Mapping[str, Any]:
    """Everything on the map: chance is one list per station, one value per size."""
    size = "stiffness_n_per_m" if found.kind == "support" else "mass_kg"
    return {
        "kind": found.kind,
        "direction": found.direction or None,
        "wanted": found.wanted,
        "station_m": found.station_m.tolist(),
        size: found.size.tolist(),
        "chance": np.round(found.chance, 4).tolist(),
        "zone": found.zone.tolist(),
        "curve": {
            "mode": found.mode or None,
            "band": found.band or None,
            size: [None if np.isnan(k) else float(k) for k in found.curve],
        },
        "kept_out": found.kept_out.tolist(),
        "words": [
            [found.words(i, j) for j in range(len(found.size))] for i in range(len(found.station_m))
        ],
        "best": _best(found),
        "warnings": list(warnings),
    }


def best_at(found: ChanceMap) -> tuple[int, int]:
    """The smallest size that reaches the wanted chance, else the highest chance."""
    chance = np.where(found.kept_out[:, None], -1.0, found.chance)
    zone = found.zone
    if zone.any():
        j = int(np.flatnonzero(zone.any(axis=0))[0])
        return int(np.argmax(np.where(zone[:, j], chance[:, j], -1.0))), j
    i, j = divmod(int(np.argmax(chance)), len(found.size))
    return i, j


def _best(found: ChanceMap) -> Mapping[str, Any]:
    i, j = best_at(found)
    return {
        "change": found.change(i, j).as_json(),
        "chance": float(found.chance[i, j]),
        "words": found.words(i, j),
    }


def picture(found: ChanceMap, rows: int, columns: int) -> list[str]:
    """Sizes upward, stations across: shade, zone, k* curve and keep-outs as characters."""
    across, up = spread(len(found.station_m), columns), spread(len(found.size), rows)[::-1]
    lines = [[_shade(found, i, j) for i in across] for j in up]
    for column, i in enumerate(across):
        row = _row_of(found, float(found.curve[i]), rows)
        if row is not None and not found.kept_out[i]:
            lines[row][column] = CURVE
    return ["".join(line) for line in lines]


def spread(count: int, cells: int) -> Where:
    """(cells,) which of the items each cell shows."""
    return np.rint(np.linspace(0, count - 1, cells)).astype(np.intp)


def _shade(found: ChanceMap, i: int, j: int) -> str:
    if found.kept_out[i]:
        return KEPT_OUT
    if found.chance[i, j] >= found.wanted:
        return ZONE
    return next(glyph for top, glyph in SHADES if found.chance[i, j] <= top)


def _row_of(found: ChanceMap, size: float, rows: int) -> int | None:
    """The row, from the top, that shows a size; None off the map."""
    low, high = np.log(found.size[[0, -1]])
    if not np.isfinite(size) or not low <= np.log(size) <= high:
        return None
    return rows - 1 - round(float(np.log(size) - low) / float(high - low) * (rows - 1))


def headline(found: ChanceMap) -> str:
    """What is mapped."""
    if found.kind == "mass":
        return "Chance that every band is clear with a mass clamped on"
    way = "vertical and lateral" if found.direction == "both" else found.direction
    return f"Chance that every band is clear with a new support, {way}"


def legend(found: ChanceMap) -> str:
    """What the characters mean."""
    shades = " ".join(f"{glyph}{100 * top:.0f}" for top, glyph in SHADES[1:-1])
    text = f"{shades} {SHADES[-1][1]}{percent(found.wanted)} {ZONE}more"
    text += f"  {KEPT_OUT}kept out" if found.kept_out.any() else ""
    if found.mode:
        symbol = "k*" if found.kind == "support" else "m*"
        text += f"  {CURVE}{symbol} mode {found.mode} leaves {found.band}"
    return text


def size_text(found: ChanceMap, j: int, units: str) -> str:
    """A size in the units of the job."""
    dimension = "stiffness" if found.kind == "support" else "mass"
    return show(float(found.size[j]), dimension, units, 2)


def station_text(station_m: float, units: str) -> str:
    """A station in the units of the job."""
    return show(station_m, "length", units, 3) if units == "US" else f"{station_m:.2f} m"


def read_out(found: ChanceMap, i: int, j: int, units: str) -> str:
    """One place and size in a line."""
    where = station_text(float(found.station_m[i]), units)
    return (
        f"{where}, {size_text(found, j, units)}: {percent(float(found.chance[i, j]))} - "
        f"{found.words(i, j)}"
    )


def lines(found: ChanceMap, units: str, warnings: Sequence[str] = ()) -> list[str]:
    """The map for a terminal without the app."""
    labels = axis_labels(found, ROWS, units)
    width = max(map(len, labels))
    drawn = [
        f"{label:>{width}} ┤{line}"
        for label, line in zip(labels, picture(found, ROWS, COLUMNS), strict=True)
    ]
    ends = station_text(float(found.station_m[-1]), units)
    axis = " " * (width + 2) + f"{station_text(0.0, units)}{ends:>{COLUMNS - 6}}"
    i, j = best_at(found)
    said = [headline(found), "", *drawn, axis, "", *paragraph(legend(found), 0), ""]
    said += paragraph(f"Best for least: {read_out(found, i, j, units)}", 0)
    if not found.zone.any():
        reasons = _reasons(found)
        said += paragraph(f"Nowhere is {percent(found.wanted)} reached: {'; '.join(reasons)}", 0)
    return said + [line for text in warnings for line in paragraph(text, 2, "! ")]


def _reasons(found: ChanceMap) -> list[str]:
    """The commonest words on the map."""
    words: dict[str, int] = {}
    for i in range(len(found.station_m)):
        for j in range(len(found.size)):
            text = found.words(i, j)
            words[text] = words.get(text, 0) + 1
    return sorted(words, key=lambda text: -words[text])[:3]


def axis_labels(found: ChanceMap, rows: int, units: str) -> list[str]:
    """(rows,) a size at the top, the bottom and each quarter, empty between."""
    up = spread(len(found.size), rows)[::-1]
    marked = {round(share * (rows - 1)) for share in (0, 0.25, 0.5, 0.75, 1)}
    return [size_text(found, int(j), units) if row in marked else "" for row, j in enumerate(up)]
