"""Unit words as people write them, read into an expression of the unit registry."""

from __future__ import annotations

import re
from difflib import get_close_matches

from fieldkit.errors import InputError

_OWN_SPELLING = (
    "m", "mm", "cm", "km", "um", "s", "ms", "kg", "g", "mg", "N", "mN", "kN", "MN", "GN", "Pa",
    "mPa", "hPa", "kPa", "MPa", "GPa", "bar", "mbar", "V", "mV", "uV", "kV", "Hz", "kHz", "MHz",
    "lbf", "kgf", "kip", "psi", "ft", "in", "mil", "rad", "deg", "K", "tonne", "inch", "foot",
    "uin",
)  # fmt: skip
_SPELLINGS = {name: name for name in _OWN_SPELLING} | {
    "%": "percent",
    "'": "foot", "feet": "foot", '"': "inch", "inches": "inch", "mils": "mil", "thou": "mil",
    "metre": "meter", "meter": "meter", "metres": "meter", "meters": "meter", "micron": "um",
    "sec": "second", "min": "minute", "minute": "minute",
    "kgs": "kg", "kilogram": "kg", "kilograms": "kg", "t": "tonne", "grams": "gram",
    "oz": "ounce", "lb": "pound", "lbs": "pound", "lbm": "pound", "pound": "pound",
    "pounds": "pound", "#": "pound", "pcf": "pound/foot**3",
    "kips": "kip", "klbf": "kip", "ksi": "kip/inch**2", "Msi": "1000*kip/inch**2",
    "barg": "bar", "psig": "psi", "kPag": "kPa", "MPag": "MPa",
    "Nm": "N*m", "kNm": "kN*m", "MNm": "MN*m",
    "rpm": "revolution/minute", "cpm": "revolution/minute", "cps": "Hz", "hertz": "Hz",
    "r": "revolution", "rev": "revolution", "revs": "revolution", "U": "revolution",
    "cycles": "revolution", "tr": "revolution",
    "radian": "rad", "radians": "rad", "degrees": "deg", "degree": "deg",
    "degC": "celsius", "C": "celsius", "celsius": "celsius", "degK": "K", "kelvin": "K",
    "degF": "fahrenheit", "F": "fahrenheit", "fahrenheit": "fahrenheit",
    "ips": "inch/second", "gn": "gravity", "volt": "volt", "volts": "volt",
}  # fmt: skip
_ANY_CASE = {
    name.lower(): name
    for name in (
        "Hz", "kHz", "rpm", "cpm", "psi", "psig", "ksi", "bar", "barg", "ft", "feet", "in",
        "inch", "inches", "lb", "lbs", "lbf", "kip", "kips", "kg", "kN", "kNm", "Nm", "mm",
        "cm", "degC", "degF", "GPa", "kPa", "celsius", "fahrenheit", "kelvin", "rev", "mil",
        "mils",
    )
}  # fmt: skip
"""Words that stay unmistakable whatever their case; MPa, MN and M are not among them."""

_POUND_IS_FORCE = dict.fromkeys(("lb", "lbs", "#", "pound", "pounds"), "pound_force")
_FORCES = _POUND_IS_FORCE | dict.fromkeys(("kg", "kgs"), "kilogram_force")
_KIPS = {"k": "kip", "K": "kip"}
_GRAVITY = {"g": "gravity", "mg": "0.001*gravity", "G": "gravity"}
_STEPS = dict.fromkeys(("C", "degC", "celsius"), "K") | dict.fromkeys(
    ("F", "degF", "fahrenheit"), "fahrenheit_step"
)
_PHASE = {"rad": "phase_radian", "radian": "phase_radian", "radians": "phase_radian"}
_IN_DIMENSION: dict[str, dict[str, str]] = {
    "force": _FORCES,
    "force_sensitivity": _FORCES,
    "stiffness": _FORCES | _KIPS,
    "rotational_stiffness": _FORCES | _KIPS,
    "pressure": _FORCES,
    "modulus": _FORCES,
    "acceleration": _GRAVITY,
    "sensitivity": _GRAVITY,
    "acceleration_sensitivity": _GRAVITY,
    "expansion": _STEPS,
    "frequency": _PHASE,
    "speed": _PHASE,
}
"""Words that mean something else in one dimension than in the rest."""

_IN_DOUBT = {
    "ton": ("a ton may be short, long or metric", "write t (1000 kg) or lb"),
    "tons": ("a ton may be short, long or metric", "write t (1000 kg) or lb"),
    "bara": ("this is an absolute pressure", "write it as gauge: 1.013 bar less"),
    "psia": ("this is an absolute pressure", "write it as gauge: 14.7 psi less"),
}
_TOKEN = re.compile(
    r"""\s*(?:(?P<name>[A-Za-z%\#_]+|["'])|(?P<power>\^?[+-]?[0-9])(?![0-9])|(?P<mark>[/()*.-]))"""
)
_DEGREES = re.compile(r"(?:°|º|\bdegrees?|\bdeg)\s*([CFK])\b")


def expression(unit: str, dimension: str) -> str:
    """A unit as people write it, as an expression of the registry; raises InputError.

    ``dimension`` decides words with two meanings; empty for none.
    """
    text = _DEGREES.sub(r"deg\1", unit)
    if dimension == "pressure":
        text = text.replace("(g)", "g").replace("(a)", "a")
    if dimension.endswith("sensitivity") and "(" not in text and text.count("/") == 2:
        text = text.replace("/", "/(", 1) + ")"
    if text.startswith("/"):
        text = "1" + text
    return _Grammar(unit, dimension).read(text)


class _Grammar:
    """Reads one unit word by word; anything it lets through, the registry can parse."""

    def __init__(self, unit: str, dimension: str) -> None:
        self.unit = unit
        self.dimension = dimension
        self.out: list[str] = []
        self.after_value = False
        self.depth = 0

    def read(self, text: str) -> str:
        position = 0
        while position < len(text):
            token = _TOKEN.match(text, position)
            if token is None:
                raise self._unreadable()
            position = token.end()
            self._take(token)
        if not self.after_value or self.depth:
            raise self._unreadable()
        return "".join(self.out)

    def _take(self, token: re.Match[str]) -> None:
        if token["name"] == "per":
            self._mark("/")
        elif token["name"]:
            self._value(f"({self._spelled(token['name'])})")
        elif token["power"] and self.after_value and not self.out[-1].startswith("**"):
            self.out.append(f"**{int(token['power'].lstrip('^'))}")
        elif token["power"] == "1":
            self._value("revolution")
        elif token["mark"]:
            self._mark(token["mark"])
        else:
            raise self._unreadable()

    def _value(self, word: str) -> None:
        self.out.append(f"*{word}" if self.after_value else word)
        self.after_value = True

    def _mark(self, mark: str) -> None:
        if mark == "(":
            self.out.append("*(" if self.after_value else "(")
            self.after_value = False
            self.depth += 1
            return
        if not self.after_value or (mark == ")" and not self.depth):
            raise self._unreadable()
        self.out.append("*" if mark in ".-" else mark)
        self.after_value = mark == ")"
        self.depth -= mark == ")"

    def _spelled(self, name: str) -> str:
        if name in _IN_DOUBT:
            raise InputError(*_IN_DOUBT[name])
        own = _IN_DIMENSION.get(self.dimension, {})
        for word in (name, _ANY_CASE.get(name.lower(), name)):
            if found := own.get(word) or _SPELLINGS.get(word):
                return found
        raise InputError(f"the unit {name!r} is not known{_meant(name)}")

    def _unreadable(self) -> InputError:
        return InputError(f"the unit {self.unit!r} cannot be read")


def _meant(name: str) -> str:
    """What an unknown unit word may have been meant to be, as the end of a sentence."""
    same_letters = [known for known in _SPELLINGS if known.lower() == name.lower()]
    close = same_letters or (get_close_matches(name, _SPELLINGS, 1, 0.75) if len(name) > 2 else [])
    return f"; did you mean {' or '.join(map(repr, close))}?" if close else ""
