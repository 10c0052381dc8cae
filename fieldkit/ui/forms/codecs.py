"""What a field of a form may hold: each kind checks a value and says how it is understood.

Values are those of the job file, as ``value_of`` makes them of typed text; ``shown`` raises
InputError where one means nothing.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Protocol

from fieldkit.errors import InputError
from fieldkit.job.typed import value_of
from fieldkit.quantity import DIMENSIONS, parse, quoted, show
from fieldkit.span.layout import Believed

AXIS_WORDS = {"+x": "", "-x": "", "+y": "", "-y": "", "+z": "up", "-z": "down"}


class Codec(Protocol):
    """One kind of field."""

    @property
    def hint(self) -> str:
        """How to type it."""
        ...

    def shown(self, value: object, units: str) -> str:
        """The value as it is understood, empty where nothing is to add; raises InputError."""
        ...


@dataclass(frozen=True)
class Words:
    """Free text."""

    hint: str = "any text"

    def shown(self, value: object, units: str) -> str:
        """Nothing to add."""
        return ""


@dataclass(frozen=True)
class Choice:
    """One of a few words."""

    options: tuple[str, ...]

    @property
    def hint(self) -> str:
        """The words."""
        return "one of " + ", ".join(self.options)

    def shown(self, value: object, units: str) -> str:
        """Nothing to add to a known word."""
        if value not in self.options:
            raise InputError(f"{quoted(value)} is not known here", f"write {self.hint}")
        return ""


@dataclass(frozen=True)
class Quantity:
    """A number with its unit."""

    dimension: str
    words: tuple[str, ...] = ()
    """Words that may stand in its place, such as ``rigid``."""

    @property
    def hint(self) -> str:
        """Examples."""
        words = f", or {', '.join(self.words)}" if self.words else ""
        return DIMENSIONS[self.dimension].examples.replace("'", "") + words

    def shown(self, value: object, units: str) -> str:
        """In the units of the job."""
        if value in self.words:
            return str(value)
        if self.words and isinstance(value, dict):
            return self._believed(value, units)
        return show(parse(value, self.dimension), self.dimension, units)

    def _believed(self, value: object, units: str) -> str:
        from fieldkit.job.readers import stiffness

        held = stiffness(self.dimension)(value)
        if not isinstance(held, Believed):
            return str(held)
        median = show(held.median, self.dimension, units)
        return f"about {median}, a factor {math.exp(held.sd_ln):.3g} either way"


@dataclass(frozen=True)
class Number:
    """A plain number between two limits; ``15 %`` is 0.15."""

    low: float
    high: float
    whole: bool = False

    @property
    def hint(self) -> str:
        """The limits."""
        return f"a {'whole ' if self.whole else ''}number from {self.low:g} to {self.high:g}"

    def shown(self, value: object, units: str) -> str:
        """The number."""
        number = parse(value, "ratio")
        if not self.low <= number <= self.high or (self.whole and number != int(number)):
            raise InputError(f"{quoted(value)} does not fit here", f"write {self.hint}")
        return f"{number:g}"


@dataclass(frozen=True)
class Direction:
    """Along an axis, or three numbers."""

    hint: str = "+x -x +y -y +z -z (z is up), or three numbers such as 1, 0, 0.5"

    def shown(self, value: object, units: str) -> str:
        """In words."""
        if isinstance(value, list) and len(value) == 3 and any(value):
            return "sloping"
        if value not in AXIS_WORDS:
            raise InputError(f"{quoted(value)} is not a direction", f"write {self.hint}")
        return AXIS_WORDS[str(value)]


@dataclass(frozen=True)
class Range:
    """One value, or two with ``to`` between them, the lower first."""

    inner: Codec

    @property
    def hint(self) -> str:
        """Of one end, and how to write both."""
        return f"{self.inner.hint}; a range with 'to'"

    def shown(self, value: object, units: str) -> str:
        """Both ends as understood."""
        ends = _items(value)
        if len(ends) > 2:
            raise InputError(f"{len(ends)} values where one or two belong", f"write {self.hint}")
        return " to ".join(self.inner.shown(end, units) for end in ends)


@dataclass(frozen=True)
class Several:
    """A list."""

    inner: Codec
    exactly: int | None = None
    joint: str = ", "

    @property
    def hint(self) -> str:
        """Of one item, and how to write several."""
        return f"{self.inner.hint}; several with '{self.joint.strip()}' between"

    def shown(self, value: object, units: str) -> str:
        """All items as understood."""
        items = _items(value)
        if self.exactly is not None and len(items) != self.exactly:
            raise InputError(
                f"{len(items)} values where {self.exactly} belong", f"write {self.hint}"
            )
        return self.joint.join(self.inner.shown(item, units) or str(item) for item in items)


def _items(value: object) -> list[object]:
    return value if isinstance(value, list) else [value]


def checked(codec: Codec, place: tuple[str, ...], text: str, units: str) -> tuple[str, str]:
    """(as understood, error sentence) of a text typed at a key path; one of them is empty."""
    try:
        return codec.shown(value_of(text, place), units), ""
    except InputError as error:
        return "", str(error)
