"""What a column's label says: its name, quantity and unit."""

from __future__ import annotations

import re
from dataclasses import dataclass

STANDARD_GRAVITY_M_PER_S2 = 9.80665
INCH_M = 0.0254
FOOT_M = 0.3048
PSI_PA = 4.4482216152605 / INCH_M**2

TIME = "time"

_UNITS: dict[str, tuple[str, float]] = {
    **dict.fromkeys(("m/s2", "m/s/s", "ms-2"), ("acceleration", 1.0)),
    **dict.fromkeys(("mm/s2", "mm/s/s", "mms-2"), ("acceleration", 1e-3)),
    **dict.fromkeys(("cm/s2", "gal"), ("acceleration", 1e-2)),
    **dict.fromkeys(("g", "gn", "g's", "gs"), ("acceleration", STANDARD_GRAVITY_M_PER_S2)),
    "mg": ("acceleration", 1e-3 * STANDARD_GRAVITY_M_PER_S2),
    "ug": ("acceleration", 1e-6 * STANDARD_GRAVITY_M_PER_S2),
    "in/s2": ("acceleration", INCH_M),
    "ft/s2": ("acceleration", FOOT_M),
    **dict.fromkeys(("m/s", "ms-1"), ("velocity", 1.0)),
    "cm/s": ("velocity", 1e-2),
    **dict.fromkeys(("mm/s", "mms-1"), ("velocity", 1e-3)),
    "um/s": ("velocity", 1e-6),
    **dict.fromkeys(("in/s", "inch/s", "ips"), ("velocity", INCH_M)),
    "ft/s": ("velocity", FOOT_M),
    **dict.fromkeys(("m", "metre", "meter"), ("displacement", 1.0)),
    "cm": ("displacement", 1e-2),
    "mm": ("displacement", 1e-3),
    **dict.fromkeys(("um", "micron", "microns"), ("displacement", 1e-6)),
    "nm": ("displacement", 1e-9),
    **dict.fromkeys(("in", "inch"), ("displacement", INCH_M)),
    **dict.fromkeys(("mil", "mils", "thou"), ("displacement", 1e-3 * INCH_M)),
    "ft": ("displacement", FOOT_M),
    "pa": ("pressure", 1.0),
    "kpa": ("pressure", 1e3),
    **dict.fromkeys(("hpa", "mbar"), ("pressure", 1e2)),
    "bar": ("pressure", 1e5),
    "psi": ("pressure", PSI_PA),
    **dict.fromkeys(("s", "sec", "secs", "second", "seconds"), (TIME, 1.0)),
    **dict.fromkeys(("ms", "msec", "millisecond", "milliseconds"), (TIME, 1e-3)),
    **dict.fromkeys(("us", "usec", "microsecond", "microseconds"), (TIME, 1e-6)),
    "ns": (TIME, 1e-9),
    "min": (TIME, 60.0),
}
_CASE_MATTERS: dict[str, tuple[str, float]] = {"MPa": ("pressure", 1e6), "mPa": ("pressure", 1e-3)}
_SAME_CHARACTER = str.maketrans(
    {"\N{MICRO SIGN}": "u", "\N{GREEK SMALL LETTER MU}": "u", "\N{SUPERSCRIPT TWO}": "2"}
    | {"\N{SUPERSCRIPT MINUS}": "-", "\N{SUPERSCRIPT ONE}": "1", "\N{MINUS SIGN}": "-"}
    | dict.fromkeys("^*. \N{MIDDLE DOT}\N{DOT OPERATOR}", "")
)
_BRACKETED = re.compile(r"(?P<name>[^\[({<]*?)[\s_,]*[\[({<]\s*(?P<unit>[^\])}>]+?)\s*[\])}>]\s*")
_LAST_WORD = re.compile(r"(?P<name>.*?)(?:\s+in\s+|[\s,]+|_)(?P<unit>[^\s,_]+)")
_QUANTITY_WORDS = (
    (re.compile(r"\bacc(?:el(?:eration)?)?\b", re.IGNORECASE), "acceleration"),
    (re.compile(r"\bvel(?:ocity)?\b", re.IGNORECASE), "velocity"),
    (re.compile(r"\bdisp(?:l|lacement)?\b", re.IGNORECASE), "displacement"),
    (re.compile(r"\b(?:press(?:ure)?|mic(?:rophone)?)\b", re.IGNORECASE), "pressure"),
    (re.compile(r"(?:\b(?:time|timestamp|elapsed|clock|zeit|temps)\b|^t$)", re.IGNORECASE), TIME),
)
_COUNTER = re.compile(
    r"#|n|no\.?|nr\.?|i|idx|index|row|point|count(?:er)?|samples?(?:\s*(?:no\.?|number|index))?",
    re.IGNORECASE,
)
_LONGEST_NAME = 60


@dataclass(frozen=True)
class Label:
    """What stands above a column."""

    name: str = ""
    quantity: str | None = None
    """A quantity of a recording, ``time``, or None."""
    scale: float | None = None
    """SI units per unit of the column; None where no unit was stated."""
    conflict: str = ""
    """The quantity its unit belongs to, where its name says another one."""

    @property
    def is_counter(self) -> bool:
        """Whether it names a column that only counts samples."""
        return bool(_COUNTER.fullmatch(self.name))


def unit_in(text: str) -> tuple[str, float] | None:
    """Quantity and SI scale of a unit as people write it; None where it is not known."""
    plain = text.strip().translate(_SAME_CHARACTER)
    return _CASE_MATTERS.get(plain) or _UNITS.get(plain.lower())


def read_label(text: str, unit_below: str = "") -> Label:
    """Name, quantity and scale from a label such as ``acc [m/s2]`` or ``velocity mm/s``.

    A unit counts where it stands in brackets or on a line of its own; without brackets only
    where it cannot be mistaken for a word: it holds a slash, or its quantity is also named.
    """
    text = printable(text)
    name, unit = _split(text)
    unit = unit or unit_in(unit_below.strip("[](){}<> "))
    named = _quantity_named(name)
    if unit is None:
        return Label(name, named)
    quantity, scale = unit
    if named is not None and named != quantity:
        return Label(text, None, None, conflict=quantity)
    return Label(name, quantity, scale)


def _split(text: str) -> tuple[str, tuple[str, float] | None]:
    bracketed = _BRACKETED.fullmatch(text)
    if bracketed:
        unit = unit_in(bracketed["unit"])
        return (bracketed["name"].strip() if unit else text), unit
    alone = unit_in(text)
    if alone and ("/" in text or alone[0] == TIME):
        return text, alone
    last = _LAST_WORD.fullmatch(text)
    unit = unit_in(last["unit"]) if last else None
    if last and unit and ("/" in last["unit"] or _quantity_named(last["name"]) == unit[0]):
        return last["name"].strip(), unit
    return text, None


def _quantity_named(name: str) -> str | None:
    words = name.replace("_", " ")
    return next((quantity for word, quantity in _QUANTITY_WORDS if word.search(words)), None)


def printable(text: str) -> str:
    """A name out of a file, safe to show: one line, no control characters, not too long."""
    shown = "".join(character if character.isprintable() else " " for character in text)
    return " ".join(shown.split())[:_LONGEST_NAME]
