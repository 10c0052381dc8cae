"""SI values as texts in the units of the job."""

from __future__ import annotations

from fieldkit.quantity import show

DIMENSION_OF = {"N/m": "stiffness", "N m/rad": "rotational_stiffness", "kg": "mass", "m": "length"}
"""Dimension of the parameters a match speaks of, by their SI unit."""
AMPLITUDES = {"m/s^2": (1.0, "m/s²"), "m/s": (1e3, "mm/s"), "m": (1e6, "µm"), "Pa": (1.0, "Pa")}
"""(factor, unit) that vibration levels are read in."""


def length(value_m: float, units: str) -> str:
    """A station or a distance, three digits."""
    return show(value_m, "length", units, 3)


def interval(low: float, high: float, unit: str, units: str) -> str:
    """``2.2–4.4 MN/m``: both ends, the unit said once where it is the same."""
    ends = [_shown(value, unit, units) for value in (low, high)]
    (first, first_unit), (second, second_unit) = (_split(end) for end in ends)
    if first_unit == second_unit:
        return f"{first}–{second} {second_unit}".strip()
    return f"{ends[0]} – {ends[1]}"


def level(rms: float, unit: str) -> str:
    """A vibration level with its unit, three digits."""
    factor, shown = AMPLITUDES.get(unit, (1.0, unit))
    return f"{factor * rms:.3g} {shown}"


def _shown(value: float, unit: str, units: str) -> str:
    if unit in DIMENSION_OF:
        return show(value, DIMENSION_OF[unit], units, 2)
    return f"{value:.3g} {unit}".strip()


def _split(text: str) -> tuple[str, str]:
    number, _, unit = text.partition(" ")
    return number, unit
