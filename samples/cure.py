"""Look for single changes that clear a plant's running state, by solving every one of them."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from frame import Hold, Lump, Pipework, assemble, solve
from numpy.typing import NDArray
from plants import Plant

Array = NDArray[np.float64]
SEARCH_STEP_M = 0.08
"""Coarser than for recordings: good to about 0.1 % on the modes that count."""


@dataclass(frozen=True)
class Cure:
    """One change, named as the command line names it, and what it gives."""

    change: dict[str, Any]
    frequency_hz: list[float]
    clearance: float
    """See ``clearance``."""


def avoided(plant: Plant) -> list[dict[str, Any]]:
    """Each order of the machine with the band its margin makes."""
    machine, margin = plant.machine, plant.margin
    found = []
    for order in machine.force_n:
        low, high = machine.slowest_rpm / 60 * order, machine.fastest_rpm / 60 * order
        band = {"low_hz": low, "high_hz": high}
        band |= {"avoid_low_hz": low * (1 - margin), "avoid_high_hz": high * (1 + margin)}
        found.append({"order": order, **band})
    return found


def clearance(frequency_hz: Array, plant: Plant) -> float:
    """Least logarithm between a mode and the edge of a band; below zero inside one.

    Modes up to a twentieth above the limit count too: a little error brings them down.
    """
    least = math.inf
    for f in frequency_hz[frequency_hz < 1.05 * plant.up_to_hz]:
        for band in avoided(plant):
            below = math.log(band["avoid_low_hz"] / f)
            above = math.log(f / band["avoid_high_hz"])
            least = min(least, max(below, above))
    return least


def running_frequencies(pipework: Pipework, plant: Plant, step_m: float, chords: int) -> Array:
    """Every natural frequency up to a little above the plant's limit."""
    return solve(assemble(pipework, step_m, chords), 1.3 * plant.up_to_hz, 12).frequency_hz


def best_cures(plant: Plant, kept: int = 6) -> list[Cure]:
    """The best of each family of changes, widest clearance first."""
    step = min(SEARCH_STEP_M, plant.length_m / 24)
    tried = [
        _judged(plant, change, pipework, step, 8)
        for change, pipework in _changes(plant, plant.pipework(plant.running))
    ]
    tried.sort(key=lambda cure: -cure.clearance)
    best = {next(iter(cure.change)): cure for cure in reversed(tried)}
    chosen = list(best.values()) + tried[:kept]
    unique = {str(cure.change): cure for cure in chosen}
    finely = [_again(plant, cure) for cure in unique.values()]
    return sorted(finely, key=lambda cure: -cure.clearance)


def _again(plant: Plant, cure: Cure) -> Cure:
    for change, pipework in _changes(plant, plant.pipework(plant.running)):
        if change == cure.change:
            return _judged(plant, change, pipework, min(0.02, plant.length_m / 100), 24)
    raise AssertionError("a cure that was found cannot be built again")


def _judged(
    plant: Plant, change: dict[str, Any], pipework: Pipework, step_m: float, chords: int
) -> Cure:
    frequency = running_frequencies(pipework, plant, step_m, chords)
    return Cure(change, [round(float(f), 3) for f in frequency], clearance(frequency, plant))


def _changes(plant: Plant, now: Pipework) -> Iterator[tuple[dict[str, Any], Pipework]]:
    families = {
        "support": _new_supports,
        "stiffen": _stiffer_supports,
        "move": _moved_supports,
        "mass": _lighter_masses,
    }
    for name, family in families.items():
        if name in plant.allow:
            yield from family(plant, now)


def _free_stations(plant: Plant) -> list[float]:
    every = np.linspace(0.06, 0.97, 19) * plant.length_m
    return [
        round(float(s), 3)
        for s in every
        if not any(low <= s <= high for low, high in plant.keep_out_m)
    ]


def _new_supports(plant: Plant, now: Pipework) -> Iterator[tuple[dict[str, Any], Pipework]]:
    for station in _free_stations(plant):
        for stiffness in plant.stiff_choices:
            springs = {"vertical": stiffness, "lateral": stiffness}
            change = {"at_m": station, "vertical_n_per_m": stiffness, "lateral_n_per_m": stiffness}
            yield (
                {"add_support": change},
                replace(now, holds=(*now.holds, Hold(station, springs))),
            )


def _stiffer_supports(plant: Plant, now: Pipework) -> Iterator[tuple[dict[str, Any], Pipework]]:
    for index, hold in enumerate(now.holds):
        for stiffness in plant.stiff_choices:
            weaker = [a for a in ("vertical", "lateral") if hold.springs.get(a, 0.0) < stiffness]
            springs = hold.springs | dict.fromkeys(weaker, stiffness)
            stated = {f"{axis}_n_per_m": stiffness for axis in weaker}
            if weaker:
                yield (
                    {"stiffen_support": {"index": index, **stated}},
                    replace(now, holds=_swapped(now.holds, index, replace(hold, springs=springs))),
                )


def _moved_supports(plant: Plant, now: Pipework) -> Iterator[tuple[dict[str, Any], Pipework]]:
    for index, hold in enumerate(now.holds):
        if 0.0 < hold.at_m < plant.length_m - 1e-6:
            for shift in (-0.4, -0.2, 0.2, 0.4):
                station = round(hold.at_m + shift, 3)
                moved = replace(hold, at_m=station)
                change = {"move_support": {"index": index, "to_m": station}}
                yield change, replace(now, holds=_swapped(now.holds, index, moved))


def _lighter_masses(_plant: Plant, now: Pipework) -> Iterator[tuple[dict[str, Any], Pipework]]:
    for index, lump in enumerate(now.lumps):
        for share in (0.0, 0.5):
            lighter = Lump(lump.at_m, share * lump.mass_kg, lump.offset_m)
            change = {"set_mass": {"index": index, "mass_kg": lighter.mass_kg}}
            yield change, replace(now, lumps=_swapped(now.lumps, index, lighter))


def _swapped(items: tuple[Any, ...], index: int, new: Any) -> tuple[Any, ...]:
    return (*items[:index], new, *items[index + 1 :])
