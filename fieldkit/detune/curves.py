"""How frequencies and chance move as one size of a change is moved: place, stiffness or mass.

Every value is judged as a ranked change is: low-rank update of all members, scaled to a full
re-solve. What is shown at a value is what a ranked change of that value would promise.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune import judge
from fieldkit.detune.candidates import NEAR_SUPPORT_DIAMETERS, Search
from fieldkit.detune.excitation import Band
from fieldkit.detune.fixes import (
    AddMass,
    AddSupport,
    AllOf,
    Change,
    MoveMass,
    MoveSupport,
    SetMass,
    StiffenSupport,
)
from fieldkit.detune.push import parts, springs_along
from fieldkit.detune.verdict import JudgedMode, Nearest
from fieldkit.detune.window import scaled, stated_stiffness
from fieldkit.errors import InputError
from fieldkit.progress import Progress
from fieldkit.span.layout import State

Array = NDArray[np.float64]

KINDS = ("place", "stiffness", "mass")
STEPS = 49
MOST_MODES = 6
EXTRA_MASS_SHARE = 0.3
"""Of the largest mass worth trying: what may come on top of a support."""


@dataclass(frozen=True)
class Varied:
    """One size of a change at n values, all else as drawn."""

    kind: str
    what: str
    """The size in words."""
    value: Array
    """(n,) m, N/m or kg, rising."""
    changes: tuple[Change, ...]
    """(n,)"""
    drawn: int
    """Number of the value that the change has."""


@dataclass(frozen=True)
class FixCurve:
    """Modes and chance at every value of one size of a change."""

    varied: Varied
    chance: Array
    """(n,) that every band is clear, as-installed scatter included."""
    modes: tuple[tuple[JudgedMode, ...], ...]
    """(n,) modes after, rising."""
    nearest: tuple[Nearest | None, ...]
    """(n,)"""
    kept_out: NDArray[np.bool_]
    """(n,) the job forbids a change there."""
    bands: tuple[Band, ...]
    wanted: float
    up_to_hz: float

    @property
    def frequency_hz(self) -> Array:
        """(n, modes, 3) of the first modes: 5 %, median, 95 %; NaN where one is above the limit."""
        count = min(MOST_MODES, max(map(len, self.modes)))
        found = np.full((len(self.modes), count, 3), np.nan)
        for i, modes in enumerate(self.modes):
            for j, mode in enumerate(modes[:count]):
                found[i, j] = mode.low_hz, mode.median_hz, mode.high_hz
        return found

    @property
    def kept(self) -> list[tuple[float, float]]:
        """Stretches of values that keep the wanted chance where something may be attached."""
        good = (self.chance >= self.wanted) & ~self.kept_out
        edges = np.flatnonzero(np.diff(np.concatenate([[0], good.astype(int), [0]])))
        value = self.varied.value
        return [
            (float(value[first]), float(value[end - 1]))
            for first, end in zip(edges[::2], edges[1::2], strict=True)
        ]


def fix_curve(
    search: Search,
    running: State,
    change: Change,
    kind: str,
    progress: Progress | None = None,
    steps: int = STEPS,
) -> FixCurve:
    """Judge a change at every value of one size; ``kind`` is one of KINDS.

    Raises InputError, with what can be asked instead, where the change has no such size.
    """
    own = varied(search, change, kind, steps)
    progress = progress or Progress()
    spectra = []
    for i, one in enumerate(own.changes):
        progress.step("moving the size", i / len(own.changes))
        spectra.append(_judged(search, running, one))
    bands, up_to_hz = search.bands, search.goal.up_to_hz
    modes = tuple(judge.judged_modes(spectrum, bands, up_to_hz) for spectrum in spectra)
    return FixCurve(
        own,
        np.array([judge.chance_clear(spectrum, bands, up_to_hz) for spectrum in spectra]),
        modes,
        tuple(judge.nearest(one, bands) for one in modes),
        np.array([not _allowed(search, own, x) for x in own.value]),
        bands,
        search.goal.chance,
        up_to_hz,
    )


def _judged(search: Search, running: State, change: Change) -> judge.Spectrum:
    base, up_to_hz = search.field, search.goal.up_to_hz
    spectrum = judge.after(base, search.push(change), up_to_hz)
    exact = judge.resolve(base, search.span, running, change, 1.3 * up_to_hz)
    return judge.corrected(spectrum, base, exact, up_to_hz)[0]


def _allowed(search: Search, own: Varied, value: float) -> bool:
    return own.kind != "place" or search.goal.may_attach(float(value))


def varied(search: Search, change: Change, kind: str, steps: int = STEPS) -> Varied:
    """The changes along one size; of several parts the first that has that size is moved.

    Raises InputError where none has.
    """
    several = parts(change)
    for number, part in enumerate(several):
        found = VARIED[kind](search, part, steps)
        if found is not None:
            return _among(several, number, found)
    if kind == "mass" and (place := _first_place(several, search)) is not None:
        return _extra_mass(search, several, place, steps)
    raise _no_curve(search, change, kind)


def curves_of(search: Search, change: Change) -> tuple[str, ...]:
    """The sizes that a change has."""
    several = parts(change)
    return tuple(
        kind
        for kind in KINDS
        if any(VARIED[kind](search, part, 2) is not None for part in several)
        or (kind == "mass" and _first_place(several, search) is not None)
    )


def _no_curve(search: Search, change: Change, kind: str) -> InputError:
    others = curves_of(search, change)
    instead = f"ask for {' or '.join(others)}" if others else "choose a change of the pipe itself"
    return InputError(f"{WHY_NONE[kind]}: no curve against {kind} makes sense here", instead)


WHY_NONE = {
    "place": "this change moves nothing along the pipe",
    "stiffness": "this change sets no stiffness",
    "mass": "this change has no place where a mass could be clamped on",
}


def _among(several: Sequence[Change], number: int, found: Varied) -> Varied:
    """The same with the other parts as drawn."""
    if len(several) == 1:
        return found
    changes = [AllOf((*several[:number], one, *several[number + 1 :])) for one in found.changes]
    return replace(
        found, changes=tuple(changes), what=f"{found.what} (part {number + 1}; the rest as drawn)"
    )


def _place(search: Search, part: Change, steps: int) -> Varied | None:
    if isinstance(part, AddSupport | AddMass):
        thing = "support" if isinstance(part, AddSupport) else "added mass"
        low, high = _inside(search, 0.0, search.span.length_m)
        value, drawn = _with_drawn(np.linspace(low, high, steps), part.at_m)
        changes: tuple[Change, ...] = tuple(replace(part, at_m=x) for x in value.tolist())
        return Varied("place", f"place of the new {thing}", value, changes, drawn)
    if isinstance(part, MoveSupport | MoveMass):
        low, high = 0.0, search.span.length_m
        thing = "mass"
        if isinstance(part, MoveSupport):
            own = search.span.supports[part.index]
            low, high = _neighbours(search, part.index)
            thing = own.kind
        low, high = _inside(search, low, high)
        value, drawn = _with_drawn(np.linspace(low, high, steps), part.to_m)
        changes = tuple(replace(part, to_m=x) for x in value.tolist())
        return Varied("place", f"new place of the {thing}", value, changes, drawn)
    return None


def _stiffness(search: Search, part: Change, steps: int) -> Varied | None:
    stated = stated_stiffness(part)
    if not stated:
        return None
    top = max(stated.values())
    levels = search.stiffness_levels()
    low, high = float(levels[0]), float(levels[-1])
    name = "new support"
    if isinstance(part, StiffenSupport):
        low = min(max(_stiffness_now(search, part, tuple(stated)), low), 0.5 * top)
        name = f"{search.span.supports[part.index].kind} in all"
    value, drawn = _with_drawn(np.geomspace(min(low, top), max(high, top), steps), top)
    changes = tuple(scaled(part, float(k) / top) for k in value)
    ways = " and ".join(stated) + (" in proportion" if len(set(stated.values())) > 1 else "")
    return Varied("stiffness", f"stiffness of the {name}, {ways}", value, changes, drawn)


def _stiffness_now(search: Search, part: StiffenSupport, axes: Sequence[str]) -> float:
    numbers = [i for axis in axes for i in springs_along(search.field, part.index, axis)]
    return max((float(np.median(search.field.spring_value(i))) for i in numbers), default=0.0)


def _mass(search: Search, part: Change, steps: int) -> Varied | None:
    if isinstance(part, AddMass):
        top = max(float(search.mass_levels()[-1]), 1.5 * part.mass_kg)
        value, drawn = _with_drawn(np.linspace(top / steps, top, steps), part.mass_kg)
        changes: tuple[Change, ...] = tuple(replace(part, mass_kg=kg) for kg in value.tolist())
        return Varied("mass", "mass clamped on", value, changes, drawn)
    if isinstance(part, SetMass):
        own = search.span.masses[part.index]
        top = max(2 * own.mass_kg, part.mass_kg)
        value, drawn = _with_drawn(np.linspace(0.0, top, steps), part.mass_kg)
        changes = tuple(replace(part, mass_kg=kg) for kg in value.tolist())
        return Varied("mass", f"mass of the {own.name}", value, changes, drawn)
    return None


VARIED = {"place": _place, "stiffness": _stiffness, "mass": _mass}


def _extra_mass(search: Search, several: Sequence[Change], at_m: float, steps: int) -> Varied:
    """A mass that comes with the change at its own place: the clamp, a weight, what hangs on it."""
    top = EXTRA_MASS_SHARE * float(search.mass_levels()[-1])
    value = np.linspace(0.0, top, steps)
    drawn = several[0] if len(several) == 1 else AllOf(tuple(several))
    heavier = tuple(AllOf((*several, AddMass(at_m, kg))) for kg in value[1:].tolist())
    return Varied("mass", "mass clamped on besides, at the same place", value, (drawn, *heavier), 0)


def _first_place(several: Sequence[Change], search: Search) -> float | None:
    """Where the first part stands on the pipe; None for a change that stands nowhere."""
    for part in several:
        if isinstance(part, AddSupport):
            return part.at_m
        if isinstance(part, MoveSupport):
            return part.to_m
        if isinstance(part, StiffenSupport):
            return search.span.supports[part.index].at_m
    return None


def _inside(search: Search, low: float, high: float) -> tuple[float, float]:
    """Off the ends by as much as a clamp needs."""
    near = min(NEAR_SUPPORT_DIAMETERS * search.span.pipe.outside_diameter_m, 0.2 * (high - low))
    return low + near, high - near


def _neighbours(search: Search, index: int) -> tuple[float, float]:
    """Stations of the supports on both sides of one, or the ends of the pipe."""
    here = search.span.supports[index].at_m
    others = [s.at_m for i, s in enumerate(search.span.supports) if i != index]
    before = max((at for at in others if at < here), default=0.0)
    after = min((at for at in others if at > here), default=search.span.length_m)
    return before, after


def _with_drawn(value: Array, drawn: float) -> tuple[Array, int]:
    """Values with the drawn one in place of the nearest, so that a step lands on it; its number.

    A drawn value beyond the ends is put before or behind them.
    """
    if not value[0] <= drawn <= value[-1]:
        found = np.sort(np.append(value, drawn))
    else:
        found = value.copy()
        found[int(np.argmin(np.abs(value - drawn)))] = drawn
    return found, int(np.flatnonzero(found == drawn)[0])
