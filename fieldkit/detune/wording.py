"""A change in one sentence, in the units the job shows."""

from __future__ import annotations

from fieldkit.detune.fixes import (
    AddAbsorber,
    AddMass,
    AddSupport,
    AllOf,
    Change,
    ChangeSpeed,
    MoveMass,
    MoveSupport,
    SetMass,
    StiffenSupport,
)
from fieldkit.quantity import show
from fieldkit.span.layout import Span
from fieldkit.span.supports import on_header


def summary(change: Change, span: Span, units: str) -> str:
    """What to do, where, how stiff or heavy."""
    if isinstance(change, AllOf):
        return " and ".join(summary(part, span, units) for part in change.parts)
    if isinstance(change, ChangeSpeed):
        return speed_summary(change)
    if isinstance(change, AddAbsorber):
        return _absorber(change, units)
    if isinstance(change, AddSupport):
        stiffness = _stiffness(change, units)
        what = "brace it to the header" if on_header(span) else "add a support"
        return f"{what} at {_length(change.at_m, units)}: {stiffness}"
    if isinstance(change, StiffenSupport):
        stiffness = _stiffness(change, units)
        return f"stiffen the {_support(span, change.index, units)} to {stiffness} in all"
    if isinstance(change, MoveSupport):
        where = _length(change.to_m, units)
        return f"move the {_support(span, change.index, units)} to {where}"
    if isinstance(change, AddMass):
        mass = show(change.mass_kg, "mass", units)
        return f"clamp {mass} on at {_length(change.at_m, units)}"
    if isinstance(change, SetMass):
        return _set_mass(change, span, units)
    if isinstance(change, MoveMass):
        old = span.masses[change.index]
        return (
            f"move the {old.name} from {_length(old.at_m, units)} to {_length(change.to_m, units)}"
        )
    raise TypeError(f"no wording for {type(change).__name__}")


def speed_summary(change: ChangeSpeed) -> str:
    """A speed in words."""
    if change.manner == "keep":
        return f"keep the {change.excitation} at {_speeds(change)} rpm"
    return f"run the {change.excitation} {change.manner}, at {_speeds(change)} rpm"


def _speeds(change: ChangeSpeed) -> str:
    low, high = f"{60 * change.low_hz:.0f}", f"{60 * change.high_hz:.0f}"
    return low if low == high else f"{low} to {high}"


def _absorber(change: AddAbsorber, units: str) -> str:
    mass, stiffness = show(change.mass_kg, "mass", units), change.stiffness_n_per_m
    return (
        f"hang a tuned absorber on at {_length(change.at_m, units)}: {mass} on "
        f"{show(stiffness, 'stiffness', units, 3)}, moving {change.direction}, with a damper of "
        f"{change.damping_n_s_per_m:.3g} N s/m"
    )


def _set_mass(change: SetMass, span: Span, units: str) -> str:
    old = span.masses[change.index]
    was = show(old.mass_kg, "mass", units)
    if change.mass_kg == 0:
        return f"take out the {old.name} ({was})"
    word = "lighten" if change.mass_kg < old.mass_kg else "weight"
    return f"{word} the {old.name} from {was} to {show(change.mass_kg, 'mass', units)}"


def _length(at_m: float, units: str) -> str:
    return show(at_m, "length", units, 3) if units == "US" else f"{at_m:.2f} m"


def _support(span: Span, index: int, units: str) -> str:
    support = span.supports[index]
    return f"{support.kind} at {_length(support.at_m, units)}"


def _stiffness(change: AddSupport | StiffenSupport, units: str) -> str:
    stated = [
        (name, getattr(change, f"{name}_n_per_m", None))
        for name in ("vertical", "lateral", "axial")
    ]
    by_value: dict[str, list[str]] = {}
    for name, value in stated:
        if value is not None:
            by_value.setdefault(show(value, "stiffness", units, 2), []).append(name)
    parts = [f"{value} {' and '.join(names)}" for value, names in by_value.items()]
    if change.rotation_n_m_per_rad is not None:
        turning = show(change.rotation_n_m_per_rad, "rotational_stiffness", units, 2)
        parts.append(f"{turning} against turning")
    return ", ".join(parts)
