"""Readers of single values of the job file: TOML value in, SI or plain Python out.

Each raises InputError without a place; ``told`` lets the schema add it.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any, TypeVar

from pydantic_core import PydanticCustomError

from fieldkit.errors import InputError, Place
from fieldkit.quantity import DIMENSIONS, chosen, parse, quoted, show
from fieldkit.span.layout import Believed, Stiffness, Vector

T = TypeVar("T")
Reader = Callable[[Any], T]

_HEADINGS: dict[str, Vector] = {
    "+x": (1.0, 0.0, 0.0),
    "-x": (-1.0, 0.0, 0.0),
    "+y": (0.0, 1.0, 0.0),
    "-y": (0.0, -1.0, 0.0),
    "+z": (0.0, 0.0, 1.0),
    "-z": (0.0, 0.0, -1.0),
}
_STIFFNESS_WORDS: dict[str, Stiffness] = {"rigid": math.inf, "free": 0.0, "unknown": "unknown"}
_FARTHEST_OFFSET_M = 10.0
_WIDEST_SPREAD = 100.0
_BELIEVED_KEYS = ("median", "spread")


def bad(where: str, what: str, remedy: str) -> InputError:
    """An error at a key of the file."""
    return InputError(what, remedy, Place(field=where))


def told(read: Reader[T]) -> Reader[T]:
    """The reader with its InputError turned into one the schema collects with the key."""

    def validate(value: Any) -> T:
        try:
            return read(value)
        except InputError as error:
            context = {"what": error.what, "remedy": error.remedy}
            raise PydanticCustomError("told", "{what}", context) from None

    return validate


def quantity(
    dimension: str,
    *,
    low: float = -math.inf,
    above: float = -math.inf,
    high: float = math.inf,
    below: float = math.inf,
) -> Reader[float]:
    """A quantity with limits in SI: ``low <= value <= high``, ``above < value < below``."""

    def read(value: Any) -> float:
        si = parse(value, dimension)
        if not (low <= si <= high and above < si < below):
            wanted = _interval(dimension, low, above, high, below)
            example = f"write {DIMENSIONS[dimension].examples}"
            raise InputError(f"{quoted(value)} is not {wanted}", example)
        return si

    return read


def _interval(dimension: str, low: float, above: float, high: float, below: float) -> str:
    """Limits in words."""
    limits = (("at least", low), ("above", above), ("at most", high), ("below", below))
    return " and ".join(
        f"{word} {show(limit, dimension)}" for word, limit in limits if math.isfinite(limit)
    )


def pair(read: Reader[float], *, both: bool = False) -> Reader[tuple[float, float]]:
    """One value (twice), or [low, high]; with ``both`` only the pair will do."""

    def read_pair(value: Any) -> tuple[float, float]:
        if not isinstance(value, list) and not both:
            one = read(value)
            return one, one
        if not isinstance(value, list) or len(value) != 2:
            raise InputError(f"{quoted(value)} is not a pair", "write [low, high]")
        low, high = read(value[0]), read(value[1])
        if low > high or (both and low == high):
            what = f"{quoted(value[0])} is not below {quoted(value[1])}"
            raise InputError(what, "write the lower one first")
        return low, high

    return read_pair


def stiffness(dimension: str) -> Reader[Stiffness]:
    """A stiffness, one of the words for it, or what is believed of it and how surely."""

    def read(value: Any) -> Stiffness:
        if isinstance(value, dict):
            return _believed(value, dimension)
        word = value.strip().lower() if isinstance(value, str) else ""
        if word in _STIFFNESS_WORDS:
            return _STIFFNESS_WORDS[word]
        try:
            return parse(value, dimension)
        except InputError as error:
            remedy = f'{error.remedy}, or "rigid", "free" or "unknown"'
            raise InputError(error.what, remedy) from None

    return read


def _believed(table: dict[str, Any], dimension: str) -> Believed:
    """``{ median = "5 MN/m", spread = 2.0 }``: a factor either way, two times out of three."""
    one = DIMENSIONS[dimension].examples.split(",")[0].split(" or ")[0].replace("'", '"')
    example = f"write {{ median = {one}, spread = 2.0 }}"
    strange = [key for key in table if key not in _BELIEVED_KEYS]
    missing = [key for key in _BELIEVED_KEYS if key not in table]
    if strange or missing:
        what = f"{quoted(strange[0])} is not a key of it" if strange else f"{missing[0]} is missing"
        raise InputError(what, example)
    median, spread = parse(table["median"], dimension), table["spread"]
    if not 0 < median < math.inf:
        raise InputError(f"a median of {quoted(table['median'])} is not above zero", example)
    if not _is_number(spread) or not 1 < spread <= _WIDEST_SPREAD:
        raise InputError(
            f"{quoted(spread)} is not a factor above 1 and at most {_WIDEST_SPREAD:g}",
            "write spread = 2.0 where the stiffness may well be half or twice the median",
        )
    return Believed(median, math.log(spread))


def direction(value: Any) -> Vector:
    """``+x`` to ``-z``, or a vector of any length; returns a unit vector."""
    remedy = "write one of +x, -x, +y, -y, +z, -z (z is up), or [dx, dy, dz]"
    if isinstance(value, str) and value.strip().lower() in _HEADINGS:
        return _HEADINGS[value.strip().lower()]
    if not isinstance(value, list) or len(value) != 3 or not all(map(_is_number, value)):
        raise InputError(f"{quoted(value)} is not a direction", remedy)
    try:
        length = math.hypot(*value)
    except OverflowError:
        length = math.inf
    if not 1e-9 < length < 1e9:
        raise InputError("this direction has no length", remedy)
    dx, dy, dz = (component / length for component in value)
    return dx, dy, dz


def _is_number(value: object) -> bool:
    return isinstance(value, (int, float)) and not isinstance(value, bool)


def offset(value: Any) -> Vector:
    """Three lengths along x, y and z."""
    if not isinstance(value, list) or len(value) != 3:
        what = f"{quoted(value)} is not an offset"
        raise InputError(what, 'write ["0 m", "0 m", "0.18 m"]: along x, y and z')
    read = quantity("offset", low=-_FARTHEST_OFFSET_M, high=_FARTHEST_OFFSET_M)
    x, y, z = (read(component) for component in value)
    return x, y, z


def order(value: Any) -> float:
    """A multiple of the shaft speed."""
    if not _is_number(value) or not 0 < value <= 1000:
        what = f"{quoted(value)} is not an order"
        raise InputError(what, "write multiples of the speed, such as [1, 2, 6]")
    return float(value)


def whole(low: int, high: int) -> Reader[int]:
    """A whole number."""

    def read(value: Any) -> int:
        if isinstance(value, bool) or not isinstance(value, int) or not low <= value <= high:
            wanted = f"{low}" if low == high else f"a whole number from {low} to {high}"
            raise InputError(f"{quoted(value)} is not {wanted}", f"write {wanted}")
        return value

    return read


def one_of(noun: str, *words: str) -> Reader[str]:
    """One of a few words."""
    return lambda value: chosen(value, noun, words)


def number_or_text(value: Any) -> str:
    """A word such as a schedule, where a bare number is as clear."""
    if isinstance(value, bool) or not isinstance(value, (str, int)) or len(str(value)) > 40:
        raise InputError(f"{quoted(value)} is not a size or schedule", 'write it as text: "40"')
    return str(value)


def raw(value: Any) -> str | int | float:
    """A quantity whose dimension another key decides; read later."""
    if isinstance(value, bool) or not isinstance(value, (str, int, float)):
        raise InputError(f"{quoted(value)} is not a quantity", "write a number with its unit")
    return value
