"""SI values as texts in the units of the job."""

from __future__ import annotations

from fieldkit.quantity import show
from fieldkit.quantity.units import to_si

DIMENSION_OF = {"N/m": "stiffness", "N m/rad": "rotational_stiffness", "kg": "mass", "m": "length"}
"""Dimension of the parameters a match speaks of, by their SI unit."""
AMPLITUDES = {"m/s^2": (1.0, "m/s²"), "m/s": (1e3, "mm/s"), "m": (1e6, "µm"), "Pa": (1.0, "Pa")}
"""(factor, unit) that vibration levels are read in."""


def length(value_m: float, units: str) -> str:
    """A station or a distance, three digits."""
    return show(value_m, "length", units, 3)


def interval(low: float, high: float, unit: str, units: str) -> str:
    """``0.63–140 MN/m``: both ends in the unit of the higher one."""
    dimension = DIMENSION_OF.get(unit)
    if dimension is None:
        return f"{low:.3g}–{high:.3g} {unit.replace('ratio', 'times')}".strip()
    number, _, shown = show(high, dimension, units, 2).partition(" ")
    scale, _ = to_si(shown, dimension)
    return f"{float(f'{low / scale:.1e}'):g}–{number} {shown}"


def level(rms: float, unit: str) -> str:
    """A vibration level with its unit, three digits."""
    factor, shown = AMPLITUDES.get(unit, (1.0, unit))
    return f"{factor * rms:.3g} {shown}"
