"""Leaving the pipe alone and the machine elsewhere: part of its range, or slower, or faster."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune import judge
from fieldkit.detune.excitation import Band, Excitation, Goal, bands
from fieldkit.detune.fixes import ChangeSpeed

Array = NDArray[np.float64]

CELLS = 60
"""Pieces a speed range is cut into; what remains is made of whole pieces."""
LEAST_KEPT = 0.2
"""Of the range: less than this is no range to run in."""
SHIFTS = np.arange(0.01, 0.31, 0.01)
"""How much slower or faster is looked at, relative."""


@dataclass(frozen=True)
class SpeedOffer:
    """A speed range with its chance, and the bands of the job at it."""

    change: ChangeSpeed
    bands: tuple[Band, ...]
    chance: float
    kept: float
    """Share of the speed range that is left; 1 where the whole range moved."""


def speed_offers(
    choosing: judge.Spectrum,
    promising: judge.Spectrum,
    excitations: Sequence[Excitation],
    goal: Goal,
) -> list[SpeedOffer]:
    """For each machine what is left of its range, and how much slower or faster it would have to
    run; only what reaches the wanted chance. Chosen on one spectrum, promised on another."""
    found = []
    for number, machine in enumerate(excitations):
        if machine.speed_hz is None:
            continue
        others = [e for i, e in enumerate(excitations) if i != number]
        for low, high, manner in _ranges(choosing, machine, others, goal):
            moved = replace(machine, speed_hz=(low, high))
            every = bands([*others, moved], goal.margin)
            chance = judge.chance_clear(promising, every, goal.up_to_hz)
            if chance >= goal.chance:
                width, whole = high - low, machine.speed_hz[1] - machine.speed_hz[0]
                kept = width / whole if manner == "keep" and whole else 1.0
                change = ChangeSpeed(machine.name, low, high, manner)
                found.append(SpeedOffer(change, every, chance, kept))
    return found


def _ranges(
    spectrum: judge.Spectrum, machine: Excitation, others: Sequence[Excitation], goal: Goal
) -> list[tuple[float, float, str]]:
    """(low, high, manner) worth promising."""
    assert machine.speed_hz is not None
    quiet = judge.members_clear(spectrum, bands(others, goal.margin), goal.up_to_hz)
    found = []
    if left := _widest(spectrum, machine, quiet, goal):
        found.append((*left, "keep"))
    for manner, sign in (("slower", -1.0), ("faster", 1.0)):
        for shift in SHIFTS:
            low, high = (speed * (1 + sign * shift) for speed in machine.speed_hz)
            if sign > 0 and _leaves_what_is_known(machine, high, goal):
                break
            moved = bands([replace(machine, speed_hz=(low, high))], goal.margin)
            clear = quiet & judge.members_clear(spectrum, moved, goal.up_to_hz)
            if judge.chance_of(clear) >= goal.chance:
                found.append((float(low), float(high), manner))
                break
    return found


def _leaves_what_is_known(machine: Excitation, high: float, goal: Goal) -> bool:
    """Whether an order that was looked at would pass the highest mode looked at."""
    assert machine.speed_hz is not None
    reach = [o * (1 + goal.margin) for o in machine.orders]
    return any(r * machine.speed_hz[1] <= goal.up_to_hz < r * high for r in reach)


def _widest(
    spectrum: judge.Spectrum, machine: Excitation, quiet: NDArray[np.bool_], goal: Goal
) -> tuple[float, float] | None:
    """The widest part of the range that is clear with the wanted chance."""
    assert machine.speed_hz is not None
    low, high = machine.speed_hz
    if high <= low:
        return None
    edges = np.linspace(low, high, CELLS + 1)
    blocked = blocked_cells(spectrum, machine.orders, edges, goal) | ~quiet[:, None]
    passed = np.concatenate([np.zeros((len(blocked), 1)), np.cumsum(blocked, axis=1)], axis=1)
    for width in range(CELLS - 1, int(np.ceil(LEAST_KEPT * CELLS)) - 1, -1):
        clear = passed[:, width:] == passed[:, :-width]
        chance = (clear.sum(axis=0) + 0.5) / (len(clear) + 1)
        best = int(np.argmax(chance))
        if chance[best] >= goal.chance:
            return float(edges[best]), float(edges[best + width])
    return None


def blocked_cells(
    spectrum: judge.Spectrum, orders: Sequence[float], edges: Array, goal: Goal
) -> NDArray[np.bool_]:
    """(members, cells) whether some mode is too close to some order at some speed of a cell."""
    hertz = spectrum.all_hz
    hertz = np.where(np.isnan(hertz) | (hertz > goal.up_to_hz), -1.0, hertz)[:, :, None]
    blocked = np.zeros((len(hertz), len(edges) - 1), dtype=bool)
    for order in orders:
        low = order * (1 - goal.margin) * edges[:-1]
        high = order * (1 + goal.margin) * edges[1:]
        blocked |= np.any((hertz >= low) & (hertz <= high), axis=1)
    return blocked


def why_speed(offer: SpeedOffer, machine: Excitation) -> str:
    """Why it works, and what it costs."""
    if offer.change.manner != "keep" or machine.speed_hz is None:
        return f"at that speed no order of the {machine.name} comes near a mode"
    low, high = machine.speed_hz
    skipped = []
    if offer.change.low_hz > low:
        skipped.append(f"{60 * low:.0f} to {60 * offer.change.low_hz:.0f}")
    if offer.change.high_hz < high:
        skipped.append(f"{60 * offer.change.high_hz:.0f} to {60 * high:.0f}")
    return (
        f"no mode lies in what remains ({100 * offer.kept:.0f} % of the range); barred: "
        f"{' and '.join(skipped)} rpm"
    )


FAILS = "fails whenever the machine runs outside that range, be it for a minute at start-up"
CAUTIONS = (
    "the machine passes through barred speeds on its way: do not dwell there, and keep governor, "
    "drive and operators from settling in them",
    "to be confirmed by those responsible for machine and process: flow, pressure, surge, critical "
    "speeds of the machine itself",
)
