"""SI to text, in the units and with the digits a person expects to see."""

from __future__ import annotations

import math

from fieldkit.quantity.units import to_si

_INCH_M = 0.0254
_Steps = tuple[tuple[float, str], ...]
"""(least SI magnitude, unit), largest first; the last holds for everything below."""

_UNITS: dict[str, tuple[_Steps, _Steps]] = {
    "length": (((0.5, "m"), (1e-3, "mm"), (0.0, "um")), ((12 * _INCH_M, "ft"), (0.0, "in"))),
    "mass": (((0.1, "kg"), (0.0, "g")), ((0.0, "lb"),)),
    "force": (((100.0, "kN"), (0.0, "N")), ((0.0, "lbf"),)),
    "frequency": (((1e4, "kHz"), (0.0, "Hz")),) * 2,
    "speed": (((0.0, "rpm"),),) * 2,
    "stiffness": (
        ((1e9, "GN/m"), (1e6, "MN/m"), (1e3, "kN/m"), (0.0, "N/m")),
        ((1.75e5, "kip/in"), (0.0, "lbf/in")),
    ),
    "rotational_stiffness": (
        ((1e6, "MN m/rad"), (1e3, "kN m/rad"), (0.0, "N m/rad")),
        ((113.0, "kip in/rad"), (0.0, "lbf in/rad")),
    ),
    "temperature": (((0.0, "degC"),), ((0.0, "degF"),)),
    "pressure": (((1e4, "bar"), (1e3, "kPa"), (0.0, "Pa")), ((1e3, "psi"), (0.0, "Pa"))),
    "modulus": (((1e9, "GPa"), (0.0, "MPa")), ((0.0, "ksi"),)),
    "density": (((0.0, "kg/m^3"),), ((0.0, "lb/ft^3"),)),
    "acceleration": (((0.0, "m/s^2"),), ((0.0, "g"),)),
    "velocity": (((1.0, "m/s"), (0.0, "mm/s")), ((0.0, "in/s"),)),
    "sound_pressure": (((1.0, "Pa"), (0.0, "mPa")),) * 2,
    "voltage": (((0.5, "V"), (0.0, "mV")),) * 2,
    "acceleration_sensitivity": (((0.0, "mV/g"),),) * 2,
    "velocity_sensitivity": (((0.0, "mV/(mm/s)"),), ((0.0, "V/(in/s)"),)),
    "displacement_sensitivity": (((0.0, "mV/um"),), ((0.0, "mV/mil"),)),
    "pressure_sensitivity": (((0.0, "mV/Pa"),),) * 2,
    "force_sensitivity": (((0.0, "mV/N"),), ((0.0, "mV/lbf"),)),
    "expansion": (((0.0, "um/m/K"),), ((0.0, "uin/in/degF"),)),
    "ratio": (((0.0, "%"),),) * 2,
}  # fmt: skip
_UNITS["offset"] = _UNITS["length"]
_UNITS["sensitivity"] = _UNITS["acceleration_sensitivity"]
_DIGITS = {"length": 4, "offset": 4, "frequency": 4, "speed": 4, "temperature": 4, "modulus": 4}
_ZERO_AS = {"pressure": 1e5}
_STIFF = ("stiffness", "rotational_stiffness")


def show(value_si: float, dimension: str, units: str = "SI", digits: int | None = None) -> str:
    """A quantity as text that ``parse`` reads back, rounded to ``digits`` significant digits.

    ``units`` is ``SI`` or ``US``. An unlimited stiffness reads ``rigid``; what is not a number
    reads ``unknown``.
    """
    if math.isnan(value_si):
        return "unknown"
    if math.isinf(value_si):
        return "rigid" if dimension in _STIFF and value_si > 0 else "unlimited"
    places = digits or _DIGITS.get(dimension, 3)
    unit = _unit_for(value_si, dimension, units, places)
    if unit == "ft":
        return _feet(value_si, places)
    return f"{_rounded(_in_unit(value_si, unit, dimension), places)} {unit}"


def _in_unit(value_si: float, unit: str, dimension: str) -> float:
    scale, offset = to_si(unit, dimension)
    return (value_si - offset) / scale


def _unit_for(value_si: float, dimension: str, units: str, places: int) -> str:
    """The unit whose step the rounded magnitude reaches; zero is shown as 1 SI would be."""
    steps = _UNITS[dimension][units == "US"]
    size = abs(float(f"{value_si:.{places - 1}e}")) or _ZERO_AS.get(dimension, 1.0)
    return next(unit for least, unit in steps if size >= least * (1 - 1e-9))


def _rounded(value: float, places: int) -> str:
    """Significant digits without trailing zeros, one decimal kept below 10; zero is ``0``."""
    if value == 0:
        return "0"
    rounded = float(f"{value:.{places - 1}e}")
    size = math.floor(math.log10(abs(rounded)))
    if size < -4 or size > 8:
        return f"{rounded:.{places}g}"
    text = f"{rounded:.{max(0, places - 1 - size)}f}"
    text = text.rstrip("0").rstrip(".") if "." in text else text
    return f"{text}.0" if size == 0 and "." not in text and places > 1 else text


def _feet(value_si: float, places: int) -> str:
    """Feet and inches as a tape reads them."""
    total = float(f"{abs(value_si) / _INCH_M:.{places - 1}e}")
    feet, inches = divmod(total, 12)
    over = _rounded(round(inches, 9), places)
    sign = "-" if value_si < 0 else ""
    return f"{sign}{feet:.0f} ft {over} in" if over != "0" else f"{sign}{feet:.0f} ft"
