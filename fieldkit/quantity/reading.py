"""Text or number to SI, with one clear sentence where that cannot be."""

from __future__ import annotations

import math

from fieldkit.errors import InputError
from fieldkit.quantity.dimensions import DIMENSIONS, Dimension
from fieldkit.quantity.numerals import MAX_LENGTH, split, tidy
from fieldkit.quantity.units import to_si

_SHOWN = 40


def quoted(value: object) -> str:
    """A value from the user's input, safe and short enough to stand in a message."""
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, dict):
        return "a table"
    if isinstance(value, list):
        return "a list"
    text = value if isinstance(value, str) else str(value)
    short = text if len(text) <= _SHOWN else text[:_SHOWN] + "..."
    return repr(short) if isinstance(value, str) else short


def parse(value: object, dimension: str) -> float:
    """Read a quantity as a person writes it; returns SI.

    ``value`` is text with a unit, or a bare number in SI where that cannot be mistaken;
    ``dimension`` is a key of DIMENSIONS. Shaft speeds come back in revolutions per second,
    temperatures in kelvin, pressures as gauge. Raises InputError.
    """
    known = DIMENSIONS[dimension]
    if isinstance(value, bool) or not isinstance(value, (str, int, float)):
        raise InputError(f"{quoted(value)} is not {known.noun}", f"write {known.examples}")
    return _checked(value, known, _si(value, dimension, known))


def _si(value: str | int | float, dimension: str, known: Dimension) -> float:
    if not isinstance(value, str):
        return _bare(_as_float(value), known)
    text = tidy(value)
    if not text:
        raise InputError(f"{known.noun} is missing", f"write {known.examples}")
    if len(text) > MAX_LENGTH:
        raise InputError(f"{quoted(value)} is too long", f"write {known.examples}")
    try:
        parts = split(text)
        if len(parts) == 1 and not parts[0][1]:
            return _bare(parts[0][0], known)
        return math.fsum(_converted(number, unit, dimension) for number, unit in parts)
    except InputError as error:
        if error.what.startswith("a bare"):
            raise
        remedy = error.remedy or f"write {known.examples}"
        raise InputError(
            f"{quoted(value)} is not {known.noun} that can be read: {error.what}", remedy
        ) from None


def _as_float(number: int | float) -> float:
    try:
        return float(number)
    except OverflowError:
        return math.inf


def _converted(number: float, unit: str, dimension: str) -> float:
    scale, offset = to_si(unit, dimension)
    return number * scale + offset


def _bare(number: float, known: Dimension) -> float:
    """A number without unit, believed to be SI where that is plausible."""
    if known.bare_from is None or (
        math.isfinite(number) and number != 0 and abs(number) < known.bare_from
    ):
        choices = " or ".join(f"'{number:g} {unit}'" for unit in known.bare_units)
        raise InputError(f"a bare {number:g} leaves its unit open", f"write {choices}")
    return number


def _checked(value: str | int | float, known: Dimension, si: float) -> float:
    example = f"write {known.examples}"
    if not math.isfinite(si):
        raise InputError(f"{quoted(value)} is not a finite number", example)
    if si < known.low or (si == known.low and not known.low_allowed):
        raise InputError(f"{quoted(value)}: {known.below or 'that is out of range'}", example)
    if si > known.high:
        raise InputError(f"{quoted(value)} is too large to be {known.noun} here", example)
    return si
