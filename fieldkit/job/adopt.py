"""Write a chosen fix into the job file, in the units of the job."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING, Any

from fieldkit.errors import InputError, Refusal
from fieldkit.job.document import unnamed_excitation
from fieldkit.quantity import show

if TYPE_CHECKING:
    from fieldkit.detune.fixes import Change
    from fieldkit.job.store import JobText

DIGITS = 7
"""Kept of every figure, so that the job computes as the fix was judged."""
ADDED_MASS_TOLERANCE = 0.02
_STIFFNESS_KEYS = {
    "vertical_n_per_m": ("vertical", "stiffness"),
    "lateral_n_per_m": ("lateral", "stiffness"),
    "axial_n_per_m": ("axial", "stiffness"),
    "rotation_n_m_per_rad": ("rotation", "rotational_stiffness"),
}

Step = Mapping[str, Any]


def adopted(text: JobText, change: Change) -> JobText:
    """The job text with a change made; masses that are taken off go last, to keep the count."""
    steps = list(_steps(change.as_json()))
    removals = [step for name, step in steps if _is_removal(name, step)]
    for name, step in steps:
        if not _is_removal(name, step):
            text = _made(text, name, step)
    for step in sorted(removals, key=lambda step: -int(step["index"])):
        text = text.without("mass", step["index"])
    return text


def _steps(change: Mapping[str, Any]) -> Iterator[tuple[str, Step]]:
    for name, step in change.items():
        if name == "all_of":
            for part in step:
                yield from _steps(part)
        else:
            yield name, step


def _is_removal(name: str, step: Step) -> bool:
    return name == "set_mass" and step["mass_kg"] == 0


def _made(text: JobText, name: str, step: Step) -> JobText:
    units = "US" if text.value("units") == "US" else "SI"

    def shown(value: float, dimension: str) -> str:
        return show(value, dimension, units, DIGITS)

    held = {
        key: shown(step[name_si], dimension)
        for name_si, (key, dimension) in _STIFFNESS_KEYS.items()
        if step.get(name_si) is not None
    }
    index = step.get("index")
    if name == "add_support":
        return text.with_new(
            "support", {"at": shown(step["at_m"], "length"), "kind": "free"} | held
        )
    if name == "stiffen_support":
        for key, value in held.items():
            text = text.with_value(f"support[{index}].{key}", value)
        return text
    if name in ("move_support", "move_mass"):
        table = name.removeprefix("move_")
        return text.with_value(f"{table}[{index}].at", shown(step["to_m"], "length"))
    if name == "add_mass":
        return text.with_new("mass", _new_mass(shown, step))
    if name == "set_mass":
        return text.with_value(f"mass[{index}].mass", shown(step["mass_kg"], "mass"))
    if name == "change_speed":
        return _with_speed(text, step)
    raise Refusal(
        f"a job file cannot hold this change ({name.replace('_', ' ')})",
        "build it, tap again, and type in the peaks as [[measured]]",
    )


def _new_mass(shown: Any, step: Step) -> dict[str, object]:
    return {
        "name": "added mass",
        "at": shown(step["at_m"], "length"),
        "mass": shown(step["mass_kg"], "mass"),
        "tolerance": ADDED_MASS_TOLERANCE,
    }


def _with_speed(text: JobText, step: Step) -> JobText:
    """The speed of an excitation, which is told by its number or its name."""
    wanted = step["excitation"]
    entries = text.value("excitation") or []
    names = [entry.get("name") or unnamed_excitation(i) for i, entry in enumerate(entries)]
    index = wanted if isinstance(wanted, int) else names.index(wanted) if wanted in names else None
    if index is None:
        raise InputError(f"the job has no excitation {wanted!r}", "adopt the change by hand")
    low, high = (f"{step[key]:.{DIGITS}g} rpm" for key in ("low_rpm", "high_rpm"))
    return text.with_value(f"excitation[{index}].speed", low if low == high else [low, high])
