"""From what the schema found to one sentence with file, line and key."""

from __future__ import annotations

from difflib import get_close_matches
from pathlib import Path
from typing import TYPE_CHECKING, Any

from fieldkit.errors import InputError, Place
from fieldkit.job.file_model import REPEATED, keys_of
from fieldkit.job.lines import Loc, Places, field_name
from fieldkit.quantity import quoted

if TYPE_CHECKING:
    from pydantic import ValidationError

_EXAMPLES = {
    "fieldkit": "fieldkit = 1",
    "pipe": '[pipe] with size = "NPS 3", schedule = "40", material = "carbon steel"',
    "leg": '[[leg]] with direction = "+x" and length = "4.2 m"',
    "support": '[[support]] with at = "0 m" and kind = "anchor"',
    "material": 'material = "carbon steel"',
    "direction": 'direction = "+x"',
    "length": 'length = "4.2 m"',
    "at": 'at = "4.1 m"',
    "kind": 'kind = "clamp"',
    "mass": 'mass = "24 kg"',
    "file": 'file = "tap-1.flac"',
    "channel": "channel = 2",
    "frequency": 'frequency = "23.4 Hz"',
    "thickness": 'thickness = "50 mm"',
    "density": 'density = "130 kg/m^3"',
    "elastic_modulus": 'elastic_modulus = "200 GPa"',
    "poisson": "poisson = 0.3",
}
_RECORDING_KIND = 'kind = "tap" or kind = "running"'
_EXPECTED = {
    "string_type": ("text", "put it in quotes"),
    "list_type": ("a list", "put it in square brackets"),
    "model_type": ("a table", "write its keys below a header in brackets"),
    "model_attributes_type": ("a table", "write its keys below a header in brackets"),
}


def complaint(error: ValidationError, found: Places, path: Path | None) -> InputError:
    """The first thing that is wrong, in the order of the file.

    A key that is missing beside one that is not known is most likely that one, misspelt.
    """
    details = error.errors(include_url=False)
    misspelt = {_loc(d)[:-1] for d in details if d["type"] == "extra_forbidden"}
    told = [d for d in details if d["type"] != "missing" or _loc(d)[:-1] not in misspelt]
    first = min(told, key=lambda detail: found.line(_loc(detail)))
    loc = _loc(first)
    what, remedy = _sentence(first, loc)
    return InputError(what, remedy, Place(path, found.line(loc), field_name(loc)))


def _loc(detail: Any) -> Loc:
    """Key path, without the marks that tell the forms of one key apart."""
    return tuple(part for part in detail["loc"] if not str(part).startswith("<"))


def _sentence(detail: Any, loc: Loc) -> tuple[str, str]:
    kind, value = detail["type"], detail["input"]
    key = str(loc[-1]) if loc else ""
    if kind == "told":
        return detail["ctx"]["what"], detail["ctx"]["remedy"]
    if kind == "missing":
        return _missing(key, loc)
    if kind == "extra_forbidden":
        return _unknown_key(key, loc)
    if kind in _EXPECTED:
        return _wrong_type(kind, value, loc)
    if kind in ("too_long", "string_too_long"):
        return f"{key} is longer than {detail['ctx']['max_length']}", "keep it shorter"
    if kind in ("too_short", "string_too_short"):
        return f"{key} is empty", f"write {_EXAMPLES.get(key, 'at least one, or leave it out')}"
    return f"{quoted(value)} cannot be used ({detail['msg'].lower()})", "correct it"


def _missing(key: str, loc: Loc) -> tuple[str, str]:
    example = (
        _RECORDING_KIND if loc[0] == "recording" and key == "kind" else _EXAMPLES.get(key, key)
    )
    if len(loc) == 1 and key in REPEATED:
        return f"the job has no [[{key}]]", f"add {example}"
    if len(loc) == 1 and key == "pipe":
        return "the job has no [pipe]", f"add {example}"
    return f"{key} is missing", f"write {example}"


def _unknown_key(key: str, loc: Loc) -> tuple[str, str]:
    table = tuple(part for part in loc[:-1] if isinstance(part, str))
    known = keys_of(table)
    close = get_close_matches(key.lower(), known, 1, 0.6)
    name = f"[{'.'.join(table)}]" if table else "a job"
    remedy = f"did you mean {close[0]}?" if close else f"its keys are {', '.join(known)}"
    return f"{quoted(key)} is not a key of {name}", remedy


def _wrong_type(kind: str, value: object, loc: Loc) -> tuple[str, str]:
    key = str(loc[-1]) if loc else "the job"
    if key in REPEATED and len(loc) == 1:
        return f"[{key}] is written once only", f"write [[{key}]], with two brackets, for each one"
    expected, remedy = _EXPECTED[kind]
    return f"{quoted(value)} is not {expected}", remedy
