"""What a fix does besides moving frequencies, and what to check before doing it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.effort import pipe_mass_kg
from fieldkit.detune.excitation import Goal
from fieldkit.detune.fixes import (
    AddMass,
    AddSupport,
    Change,
    MoveMass,
    MoveSupport,
    SetMass,
    StiffenSupport,
)
from fieldkit.errors import Refusal
from fieldkit.quantity import show
from fieldkit.span.held import Holding, holding
from fieldkit.span.layout import Span, State, axis_vectors
from fieldkit.span.static import WeightAnswer, weight_answer
from fieldkit.span.supports import on_header, springs

Array = NDArray[np.float64]

ALWAYS = (
    "to be confirmed by the responsible piping engineer under the local code before any work; "
    "do not weld, clamp or unbolt on a line in service without the site's permit"
)
HEAVY_SHARE = 0.2
"""An added mass above this share of the pipe's own deserves a word."""
NOTABLE_MOVEMENT_M = 0.5e-3
NOTABLE_LOAD_N = 20.0
LEAST_TOLD_N = 1.0
HOT_K = 273.15 + 60
"""Metal above this burns at a touch (common practice, no source)."""
PRESSURISED_PA = 0.1e5
_DIRECTIONS = ("vertical", "lateral", "axial")


@dataclass(frozen=True)
class Resting:
    """The span at rest as it is now, computed once for all changes."""

    span: Span
    tapped: State
    running: State
    holding: Holding
    weight: WeightAnswer | None
    weight_refused: str = ""


def at_rest(span: Span, tapped: State, running: State) -> Resting:
    """Sag, support loads and thermal growth before any change."""
    held = holding(span, tapped, running)
    try:
        return Resting(span, tapped, running, held, weight_answer(span, running))
    except Refusal as refusal:
        return Resting(span, tapped, running, held, None, str(refusal))


def cautions(
    change: Change, resting: Resting, least_share: float | None, goal: Goal, units: str
) -> tuple[str, ...]:
    """In words for the person who will do it; ``least_share`` is of the drawn stiffness."""
    found: list[str] = []
    if least_share is not None:
        found.append(_stiffness_needed(change, least_share, goal, units))
    found += _weight(change, resting, units)
    found += _heat(change, resting, units)
    found += _mass(change, resting.span, units)
    found += _small_bore(change, resting.span)
    return (*(text for text in found if text), ALWAYS)


def working_cautions(change: Change, resting: Resting, units: str) -> tuple[str, ...]:
    """What to mind when steel is put up beside this line, its state named."""
    running = resting.running
    temperature = show(running.temperature_k, "temperature", units, 3)
    pressure = show(running.pressure_pa, "pressure", units, 3)
    found = [
        f"the line runs at {temperature} and {pressure}, was tapped at "
        f"{show(resting.tapped.temperature_k, 'temperature', units, 3)}; other states (start-up, "
        "steam-out, upset) were not looked at"
    ]
    if running.temperature_k > HOT_K:
        found.append(
            "hot to the touch: work on it cold, keep insulation and its shoe, and leave a hot line "
            "room to grow"
        )
    if running.pressure_pa > PRESSURISED_PA:
        found.append(
            "under pressure: do not weld to, drill, unbolt or hammer the pipe in service; a clamp "
            "with a liner needs no weld on it"
        )
    if _restrained_at(change, resting.span) is not None:
        found.append(
            "weld to structure, never to the pipe without a qualified procedure for its material; "
            "the strength of steel, welds and anchors is not checked here, only stiffness"
        )
    found += [*_heat(change, resting, units), *_mass(change, resting.span, units)]
    return (*found, *_small_bore(change, resting.span), ALWAYS)


def _small_bore(change: Change, span: Span) -> list[str]:
    """A branch moves with its header: what holds it must as well."""
    if not on_header(span):
        return []
    found = ["small bore: never strike or bend it under pressure, and look for cracks at the weld"]
    if _restrained_at(change, span) is not None:
        found.append(
            "brace it back to the header, never to structure: held from outside it is bent "
            "wherever the header moves (the header is taken as still here)"
        )
    return found


def _stiffness_needed(change: Change, least_share: float, goal: Goal, units: str) -> str:
    drawn = max((getattr(change, f"{axis}_n_per_m", None) or 0.0) for axis in _DIRECTIONS)
    if not drawn:
        return ""
    least = show(least_share * drawn, "stiffness", units, 2)
    return (
        f"clamp, bracket and what they stand on together must give at least {least}: below that "
        f"the chance falls under {100 * goal.chance:.0f} %"
    )


def _weight(change: Change, resting: Resting, units: str) -> list[str]:
    """Sag and support load before and after, filled and running."""
    span, before = resting.span, resting.weight
    if before is None:
        return [f"sag and support loads could not be computed: {resting.weight_refused}"]
    after = weight_answer(change.apply(span), resting.running)
    found = []
    if abs(after.sag_m - before.sag_m) > max(0.05e-3, 0.1 * before.sag_m):
        found.append(
            f"sag under weight goes from {_small(before.sag_m, units)} to "
            f"{_small(after.sag_m, units)}"
        )
    if isinstance(change, AddSupport):
        return found + _new_support_load(change, resting, units)
    if isinstance(change, MoveSupport | StiffenSupport):
        load = float(np.linalg.norm(after.support_loads[change.index][1]))
        if load >= NOTABLE_LOAD_N:
            found.append(f"this support carries about {_force(load, units)} of weight")
    return found


def _new_support_load(change: AddSupport, resting: Resting, units: str) -> list[str]:
    """What a support set without load in the tapped state comes to carry in the running one."""
    if not change.vertical_n_per_m:
        return []
    load = resting.holding.load(change.at_m, "vertical", change.vertical_n_per_m)
    filling, heat = float(np.linalg.norm(load.filling_n)), float(np.linalg.norm(load.heat_n))
    if max(filling, heat) < NOTABLE_LOAD_N:
        return []
    return [
        f"set snug and free of load as {resting.tapped.name}, it comes to carry about "
        f"{_force(filling, units)} from filling and {_force(heat, units)} from heat, "
        f"{resting.running.name}; shim it so that it neither lifts nor hangs"
    ]


def _force(newtons: float, units: str) -> str:
    """A load; below one that matters, in round words."""
    if newtons < LEAST_TOLD_N:
        return f"less than {show(LEAST_TOLD_N, 'force', units, 2)}"
    return show(newtons, "force", units, 2)


def _heat(change: Change, resting: Resting, units: str) -> list[str]:
    """Free thermal movement at the station that a new restraint would hold back."""
    span, tapped, running = resting.span, resting.tapped, resting.running
    station = _restrained_at(change, span)
    if station is None:
        return []
    movement = resting.holding.growth.at(station)
    held = float(np.linalg.norm(_held_directions(change, span, station) @ movement))
    size = float(np.linalg.norm(movement))
    if held >= NOTABLE_MOVEMENT_M:
        return [
            f"between {tapped.name} and {running.name} the pipe wants to move "
            f"{_small(held, units)} in a direction this holds: it loads pipe and nozzles; use a "
            "guide with a gap or a spring, or have the flexibility checked"
        ]
    if size >= NOTABLE_MOVEMENT_M:
        return [
            f"between {tapped.name} and {running.name} the pipe moves {_small(size, units)} here "
            "across what this holds: leave it free to slide"
        ]
    return []


def _held_directions(change: Change, span: Span, station_m: float) -> Array:
    """Unit vectors (k, 3) that a support change restrains; a moved support holds every way."""
    tangent = span.centre_line.at(station_m)[1]
    axes = [a for a in _DIRECTIONS if getattr(change, f"{a}_n_per_m", None)]
    if isinstance(change, MoveSupport):
        own = {s.axis for s in springs(span) if s.support == change.index}
        axes = [a for a in _DIRECTIONS if a in own]
    if not axes:
        return np.zeros((1, 3))
    return np.concatenate([axis_vectors(tangent, axis) for axis in axes])


def _small(length_m: float, units: str) -> str:
    """A small movement: millimetres, or inches."""
    return show(length_m, "length", units, 2) if units == "US" else f"{1e3 * length_m:.1f} mm"


def _restrained_at(change: Change, span: Span) -> float | None:
    if isinstance(change, AddSupport):
        return change.at_m
    if isinstance(change, MoveSupport):
        return change.to_m
    return span.supports[change.index].at_m if isinstance(change, StiffenSupport) else None


def _mass(change: Change, span: Span, units: str) -> list[str]:
    if isinstance(change, AddMass):
        share = change.mass_kg / pipe_mass_kg(span)
        heavy = " - heavy for this line: check the supports" if share > HEAVY_SHARE else ""
        return [
            f"the mass is {100 * share:.0f} % of the pipe's own{heavy}; clamp it so that it cannot "
            "slip"
        ]
    if isinstance(change, SetMass):
        if change.mass_kg == 0:
            return [f"only if the line can do without the {span.masses[change.index].name}"]
        return [f"needs a {show(change.mass_kg, 'mass', units)} replacement of the same duty"]
    if isinstance(change, MoveMass):
        return ["needs a new spool piece; access and process function must allow it"]
    return []
