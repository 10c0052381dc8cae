"""Between the values of a job file and the one line of text a form shows and takes."""

from __future__ import annotations

import re
import tomllib
from typing import Any

from fieldkit.errors import InputError
from fieldkit.job.lines import Loc, Places

_PAIRS = {("state", "fill"), ("excitation", "speed"), ("excitation", "frequency")}
_NUMBERS = {
    "fieldkit", "fill", "tolerance", "channel", "damping", "margin", "margin_measured", "chance",
    "orders", "poisson",
}  # fmt: skip
_STRETCHES = (("keep_out",), ("steel",))
_TO = re.compile(r"\s+(?:to|-|–)\s+|\s*\.\.+\s*|\s*;\s*")
_ITEM = re.compile(r"\s*;\s*|\s*,\s+|\s*,(?=[^0-9])")
_ANY_GAP = re.compile(r"[\s,;]+")
_BARE = re.compile(r"[-+]?[0-9]+(?:[.,][0-9]+)?(?:[eE][-+]?[0-9]+)?")
_UNIT_AT_END = re.compile(r"[0-9.]\s*(?P<unit>[^\d\s.,;+-].*)$")


def text_of(value: object, loc: Loc = (), found: Places | None = None) -> str:
    """A value as one line; a number as it is written in the file; empty for None."""
    if value is None:
        return ""
    if isinstance(value, str):
        return value
    if isinstance(value, list):
        joint = " to " if _is_pair(loc) else "; " if loc[-1:] in _STRETCHES else ", "
        return joint.join(text_of(item, (*loc, i), found) for i, item in enumerate(value))
    spot = found.valued(loc) if found else None
    if spot and found:
        return found.text[spot.value_start : spot.end]
    return str(value).lower() if isinstance(value, bool) else str(value)


def _is_pair(loc: Loc) -> bool:
    return (loc[0], loc[-1]) in _PAIRS or loc[-2:-1] in _STRETCHES if loc else False


def value_of(text: str, loc: Loc) -> object:
    """What to write into the file for a text typed at a key; whether it fits, the schema says."""
    key, text = loc[-1], text.strip()
    if text[:1] == "{":
        return _table(text)
    inner = text[1:-1].strip() if text[:1] == "[" and text[-1:] == "]" else text
    if _is_pair(loc):
        parts = _with_unit_of_last(_TO.split(inner))
        values = [_single(part, key) for part in parts]
        return values if len(values) > 1 else values[0]
    if (key,) in _STRETCHES:
        stretches = [part for part in re.split(r"\s*;\s*", inner) if part]
        return [_with_unit_of_last(_TO.split(part)) for part in stretches]
    if key in ("orders", "allow"):
        return [_single(part, key) for part in _ANY_GAP.split(inner) if part]
    if key == "offset":
        return _with_unit_of_last([part for part in _ITEM.split(inner) if part])
    if loc[0] == "leg" and key == "direction":
        return _heading(inner) or text
    return _single(text, key)


def _table(text: str) -> object:
    """An inline table, or the text where it is none."""
    try:
        return tomllib.loads(f"value = {text}")["value"]
    except tomllib.TOMLDecodeError:
        return text


def _single(text: str, key: str | int) -> object:
    """A number where the key holds one and the text is one; else the text."""
    plain = text.strip()
    if key not in _NUMBERS or not _BARE.fullmatch(plain):
        return plain
    number = float(plain.replace(",", "."))
    whole = number == int(number) and "." not in plain and "," not in plain
    return int(number) if whole else number


def _heading(text: str) -> list[float] | None:
    """The three numbers of a direction, where the text is that."""
    parts = [part for part in _ANY_GAP.split(text) if part]
    if len(parts) != 3 or not all(_BARE.fullmatch(part) for part in parts):
        return None
    return [float(part) for part in parts]


def _with_unit_of_last(parts: list[str]) -> list[str]:
    """``1450`` and ``1495 rpm`` mean ``1450 rpm`` and ``1495 rpm``."""
    unit = _UNIT_AT_END.search(parts[-1].strip()) if parts else None
    if unit is None:
        return [part.strip() for part in parts]
    return [
        f"{part.strip()} {unit['unit']}" if _BARE.fullmatch(part.strip()) else part.strip()
        for part in parts
    ]


def rendered(value: Any) -> str:
    """A value as TOML; raises InputError for what TOML cannot hold."""
    from tomlkit import inline_table, item
    from tomlkit.exceptions import ConvertError

    try:
        held = item(value)
        if isinstance(value, dict):
            held = inline_table()
            held.update(value)
        text = str(held.as_string())
        text.encode("utf-8")
    except (ConvertError, UnicodeEncodeError, ValueError):
        raise InputError("this cannot be written to a file", "type it anew") from None
    return text
