"""Unit words to factors through one small pint registry, built on first use."""

from __future__ import annotations

import math
from functools import cache
from typing import TYPE_CHECKING, Any

from fieldkit.errors import InputError
from fieldkit.quantity.dimensions import DIMENSIONS
from fieldkit.quantity.spelling import expression

if TYPE_CHECKING:
    from pint import Quantity, UnitRegistry

_DEFINITIONS = """
micro- = 1e-6 = u-
milli- = 1e-3 = m-
centi- = 1e-2 = c-
hecto- = 1e2 = h-
kilo- = 1e3 = k-
mega- = 1e6 = M-
giga- = 1e9 = G-
meter = [length] = m
second = [time] = s
gram = [mass] = g
kelvin = [temperature]; offset: 0 = K
volt = [voltage] = V
radian = [angle] = rad
revolution = []
percent = 0.01
phase_radian = 0.15915494309189535
degree = 0.017453292519943295 * radian = deg
minute = 60 * second
hertz = revolution / second = Hz
gravity = 9.80665 * meter / second ** 2
newton = kilogram * meter / second ** 2 = N
pascal = newton / meter ** 2 = Pa
bar = 1e5 * pascal
inch = 0.0254 * meter = in
foot = 0.3048 * meter = ft
mil = 0.001 * inch
pound = 0.45359237 * kilogram
ounce = pound / 16
tonne = 1000 * kilogram
pound_force = pound * gravity = lbf
kilogram_force = kilogram * gravity = kgf
kip = 1000 * pound_force
psi = pound_force / inch ** 2
celsius = kelvin; offset: 273.15
fahrenheit = 5 / 9 * kelvin; offset: 255.3722222222222
fahrenheit_step = 5 / 9 * kelvin
"""
"""Exact by definition: the inch, the pound and standard gravity (international yard and pound
agreement, 1959; 3rd CGPM, 1901)."""

_WITH_OFFSET = ("(celsius)", "(fahrenheit)")


@cache
def _registry() -> UnitRegistry[Any]:
    from pint import UnitRegistry

    registry: UnitRegistry[Any] = UnitRegistry(None, on_redefinition="raise")
    registry.load_definitions([line for line in _DEFINITIONS.splitlines() if line])
    return registry


@cache
def to_si(unit: str, dimension: str) -> tuple[float, float]:
    """(scale, offset) such that ``value * scale + offset`` is SI.

    Raises InputError when the unit is unknown or of another dimension.
    """
    written = expression(unit, dimension)
    for si in DIMENSIONS[dimension].si:
        one = _in_base(written, si, 1.0)
        if one is None:
            continue
        offset = _in_base(written, si, 0.0) or 0.0 if written in _WITH_OFFSET else 0.0
        return _tidied(one - offset), _tidied(offset)
    raise InputError(_mismatch(unit, dimension))


def _in_base(written: str, si: str, number: float) -> float | None:
    """``number`` of a unit in SI; None where the unit is of another dimension."""
    from pint.errors import PintError

    try:
        unit, base = _read(written), _read(expression(si, ""))
        quantity = type(unit)(number * unit.magnitude, unit.units)
        return float(quantity.to(base.units).magnitude / base.magnitude)
    except (PintError, ArithmeticError):
        return None


def _read(written: str) -> Quantity[Any]:
    registry = _registry()
    quantity: Quantity[Any] = registry.Quantity(registry.parse_expression(written))
    return quantity


def _tidied(factor: float) -> float:
    """Without the rounding of a chain of conversions: 0.0254, not 0.025399999999999999."""
    short = float(f"{factor:.12g}")
    return short if math.isclose(short, factor, rel_tol=1e-15) else factor


def _mismatch(unit: str, dimension: str) -> str:
    noun = DIMENSIONS[dimension].noun
    for other, known in DIMENSIONS.items():
        if known.noun != noun and _is_unit_of(unit, other):
            return f"{unit!r} is the unit of {known.noun}, not of {noun}"
    return f"{unit!r} is not a unit of {noun}"


def _is_unit_of(unit: str, dimension: str) -> bool:
    try:
        written = expression(unit, dimension)
    except InputError:
        return False
    return any(_in_base(written, si, 1.0) is not None for si in DIMENSIONS[dimension].si)
