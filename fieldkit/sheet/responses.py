"""A frequency response as lines of text, as a JSON document and as columns of a file."""

from __future__ import annotations

import csv
import io
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import numpy as np

from fieldkit.errors import InputError
from fieldkit.quantity import show
from fieldkit.sheet.plain import Cells, clean, paragraph, table, with_doubt
from fieldkit.signal.modal_response import ModeInResponse
from fieldkit.workup import EffectiveMass, ResponseReading, response_notes

Document = dict[str, Any]

POINTS = {
    "driving": "struck at the sensor",
    "transfer": "struck elsewhere than at the sensor",
    "unknown": "struck nobody said where",
}


Responses = Sequence[ResponseReading | None]
"""One for each recording; None for one without a hammer."""


def documents(
    found: Responses, up_to_hz: float, written: Mapping[int, Path]
) -> list[Document | None]:
    """One for each recording; ``written`` holds the file of each response by its number."""
    return [
        None
        if one is None
        else document(one, up_to_hz) | ({"file": str(written[i])} if i in written else {})
        for i, one in enumerate(found)
    ]


def lines(found: Responses, up_to_hz: float, units: str, written: Mapping[int, Path]) -> list[str]:
    """A short section for each response, and where it was written to."""
    out: list[str] = []
    for i, one in enumerate(found):
        out += section(one, up_to_hz, units) if one else []
        out += [f"  Written to {clean(str(written[i]))}"] if i in written else []
    return out


def document(found: ResponseReading, up_to_hz: float) -> Document:
    """What the response says; only why not where there is none."""
    if found.response is None:
        return {"refused": found.refused}
    response = found.response
    modes = found.fitted.modes if found.fitted else ()
    return {
        "quantity": response.quantity,
        "unit": response.unit,
        "calibrated": response.calibrated,
        "blows": response.blows,
        "point": found.point,
        "usable_to_hz": found.usable_to_hz,
        "modes": [_mode(found, *pair) for pair in zip(modes, found.masses, strict=True)],
        "notes": list(response_notes(found, up_to_hz)),
    }


def _mode(found: ResponseReading, mode: ModeInResponse, mass: EffectiveMass | None) -> Document:
    return {
        "frequency_hz": mode.frequency_hz,
        "damping_ratio": mode.damping_ratio,
        "coherence": mode.coherence,
        "magnitude": peak_of(found, mode),
        "effective_mass_kg": mass.kg if mass else None,
        "effective_mass_sd_kg": mass.sd_kg if mass else None,
    }


def peak_of(found: ResponseReading, mode: ModeInResponse) -> float:
    """Magnitude of the fitted response at a mode, in the unit of the response."""
    assert found.fitted is not None
    return float(np.abs(found.fitted.at(np.array([mode.frequency_hz])))[0])


def section(found: ResponseReading, up_to_hz: float, units: str) -> list[str]:
    """One response for people."""
    notes = [line for text in response_notes(found, up_to_hz) for line in paragraph(text, 2, "! ")]
    if found.response is None:
        return ["", f"Frequency response of {clean(found.file)}", *notes]
    return ["", *paragraph(headline(found), 0), *mode_table(found, units), *notes]


def headline(found: ResponseReading) -> str:
    """What was measured, how often, and how far up."""
    response = found.response
    assert response is not None
    unit = f"in {response.unit}" if response.calibrated else "in relative units, uncalibrated"
    blows = "1 blow" if response.blows == 1 else f"{response.blows} blows"
    reach = f", force usable to {found.usable_to_hz:.0f} Hz" if found.usable_to_hz else ""
    return (
        f"Frequency response of {found.file}: {response.quantity} {unit}, {blows}, "
        f"{POINTS[found.point]}{reach}"
    )


def mode_table(found: ResponseReading, units: str) -> list[str]:
    """Coherence and effective mass at each mode; nothing where no mode is fitted."""
    cells = mode_cells(found, units)
    return table(*cells) if cells else []


def mode_cells(found: ResponseReading, units: str) -> Cells | None:
    """The same before it is laid out; None where no mode is fitted."""
    if found.fitted is None:
        return None
    rows = [
        (
            f"{mode.frequency_hz:.2f}",
            "-" if mode.coherence is None else f"{mode.coherence:.3f}",
            f"{peak_of(found, mode):.3g}",
            *shown_mass(mass, units),
        )
        for mode, mass in zip(found.fitted.modes, found.masses, strict=True)
    ]
    return Cells(("mode Hz", "coherence", "at its peak", "effective mass", "±"), rows)


def shown_mass(mass: EffectiveMass | None, units: str) -> tuple[str, str]:
    """With its unit, and its doubt in per cent."""
    if mass is None:
        return "-", "-"
    _, doubt = with_doubt(0.0, 100 * mass.sd_kg / mass.kg, most_decimals=1)
    return show(mass.kg, "mass", units), f"{doubt} %"


def columns_text(found: ResponseReading, up_to_hz: float) -> str:
    """Comma-separated columns up to a frequency, the unit of each in its head.

    Raises InputError where there is no response.
    """
    response = found.response
    if response is None:
        raise InputError(
            f"{found.file} has no frequency response: {found.refused}", "leave --response out"
        )
    kept = response.frequency_hz <= up_to_hz
    at = response.frequency_hz[kept]
    unit = f"[{response.unit}]"
    name = response.quantity
    columns = {
        "frequency [Hz]": at,
        f"{name} H1 real {unit}": response.h1[kept].real,
        f"{name} H1 imaginary {unit}": response.h1[kept].imag,
        f"{name} H2 real {unit}": response.h2[kept].real,
        f"{name} H2 imaginary {unit}": response.h2[kept].imag,
    }
    if response.coherence is not None:
        columns["coherence [1]"] = response.coherence[kept]
    if found.fitted is not None:
        fitted = found.fitted.at(at)
        columns[f"{name} fitted real {unit}"] = fitted.real
        columns[f"{name} fitted imaginary {unit}"] = fitted.imag
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(columns)
    writer.writerows(
        [f"{value:.9g}" for value in row] for row in zip(*columns.values(), strict=True)
    )
    return out.getvalue()
