"""Numbers as people write them: decimal commas, fractions, feet and inches, powers of ten."""

from __future__ import annotations

import re
from fractions import Fraction

from fieldkit.errors import InputError

MAX_LENGTH = 80

_LOOKALIKES = str.maketrans(
    {
        "−": "-", "–": "-", "‑": "-",
        "×": "*", "·": "*", "⋅": "*", "∙": "*",
        "′": "'", "’": "'", "″": '"', "”": '"', "“": '"',
        "µ": "u", "μ": "u", "²": "^2", "³": "^3", "⁴": "^4",
        "\u00a0": " ", "\u2009": " ", "\u202f": " ",
        "¼": " 1/4", "½": " 1/2", "¾": " 3/4", "⅛": " 1/8", "⅜": " 3/8", "⅝": " 5/8", "⅞": " 7/8",
    }
)  # fmt: skip
_DECIMAL = r"(?:[0-9]+(?:[.,][0-9]*)?|[.,][0-9]+)"
_SCIENTIFIC = rf"{_DECIMAL}(?:[eE][+-]?[0-9]{{1,3}}|\s*[*x]\s*10\s*\^\s*[+-]?[0-9]{{1,3}})?"
_MIXED = r"(?:(?:[0-9]+[\s-]+)?[0-9]+/[0-9]+)"
_SIGN = r"(?P<sign>[+-]?)\s*"
_FEET = re.compile(
    rf"{_SIGN}(?P<feet>{_DECIMAL})\s*(?:'|ft\b\.?|foot\b|feet\b|ft(?=[0-9]))[\s-]*"
    rf"(?P<inches>{_MIXED}|{_DECIMAL})\s*(?:\"|''|in\b\.?|inch\b|inches\b)",
    re.IGNORECASE,
)
_ONE = re.compile(
    rf"{_SIGN}(?P<number>{_MIXED}(?![0-9.,])|{_SCIENTIFIC})\s*(?P<unit>.*)", re.DOTALL
)
_THOUSANDS = re.compile(r"[0-9]{1,3}([.,' _])[0-9]{3}(?:\1[0-9]{3})+(?![0-9])")
_COMMA_IN_DOUBT = re.compile(r"[1-9][0-9]{0,2},[0-9]{3}(?![0-9])")

Part = tuple[float, str]


def tidy(text: str) -> str:
    """The text with typographic lookalikes replaced by plain characters."""
    return " ".join(text.translate(_LOOKALIKES).replace("**", "^").split())


def split(text: str) -> list[Part]:
    """``text`` as (number, unit) parts to be added; raises InputError when it is no number.

    One part, or two for feet and inches. The unit is empty for a bare number.
    """
    _refuse_thousands(text)
    if feet := _FEET.fullmatch(text):
        return _feet_and_inches(feet["sign"], feet["feet"], feet["inches"])
    one = _ONE.fullmatch(text)
    if one is None:
        raise InputError("it does not start with a number")
    unit = one["unit"]
    if unit[:1] in set("0123456789.,_") and not re.match(r"1\s*/", unit):
        raise InputError("its number cannot be read")
    if "/" in one["number"] and not unit:
        raise InputError("a fraction needs its unit")
    return [(_signed(one["sign"], _number(one["number"])), unit)]


def _refuse_thousands(text: str) -> None:
    grouped = _THOUSANDS.search(text)
    if grouped is None and not (grouped := _COMMA_IN_DOUBT.search(text)):
        return
    digits = re.sub(r"[^0-9]", "", grouped[0])
    both = f" or {grouped[0].replace(',', '.')}" if grouped[0].count(",") == 1 else ""
    raise InputError(
        f"{grouped[0]} may be read in two ways",
        f"write {digits}{both}, without thousands separators",
    )


def _feet_and_inches(sign: str, feet: str, inches: str) -> list[Part]:
    over = _number(inches)
    if over >= 12:
        raise InputError("the inches after the feet must be below 12")
    return [(_signed(sign, _number(feet)), "ft"), (_signed(sign, over), "in")]


def _signed(sign: str, number: float) -> float:
    return -number if sign == "-" else number


def _number(text: str) -> float:
    """A mixed fraction, or a decimal with an optional power of ten."""
    if "/" in text:
        try:
            return float(sum(Fraction(part) for part in re.split(r"[\s-]+", text)))
        except (ZeroDivisionError, OverflowError):
            raise InputError("its fraction cannot be read") from None
    plain = re.sub(r"\s*[*x]\s*10\s*\^\s*", "e", text)
    return float(plain.replace(",", "."))
