"""The spans of the bench: what the engineer writes down, drawn at random, family by family."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from fieldkit.span.layout import Leg, PointMass, Span, State, Support
from fieldkit.span.materials import material
from fieldkit.span.pipes import standard_pipe

Draw = np.random.Generator

TAPPED_FILL = ((0.0, 0.0), (0.0, 1.0), (1.0, 1.0))
"""Drained, nobody knows, full."""
TAPPED_FILL_SHARE = (0.6, 0.25, 0.15)


@dataclass(frozen=True)
class Described:
    """A span as the job file has it, in both states."""

    family: str
    span: Span
    tapped: State
    running: State
    up_to_hz: float
    taps_between_m: tuple[float, float]
    """Where a sensor may sit."""


def single(rng: Draw) -> Span:
    """One span between two supports, with or without a valve."""
    length = _taped(rng.uniform(2.5, 6.0))
    first = rng.choice(["anchor", "nozzle", "clamp"])
    last = rng.choice(["clamp", "u-bolt", "guide", "rest"])
    masses = [_valve(rng, rng.uniform(0.25, 0.75) * length)] if rng.random() < 0.6 else []
    return _line(rng, length, [(0.0, first), (length, last)], masses)


def double(rng: Draw) -> Span:
    """Two spans over a middle support, with a valve in one."""
    bays = np.round(rng.uniform(2.2, 4.8, 2), 2)
    kinds = (
        rng.choice(["anchor", "nozzle"]),
        rng.choice(["clamp", "u-bolt", "guide", "rest"]),
        rng.choice(["clamp", "u-bolt", "anchor"]),
    )
    valve = _valve(rng, rng.uniform(0.2, 0.8) * float(bays[0]))
    return _line(rng, _taped(bays.sum()), list(zip(_ends(bays), kinds, strict=True)), [valve])


def several(rng: Draw) -> Span:
    """Three or four spans over mixed supports, two of them hardly known."""
    bays = np.round(rng.uniform(2.2, 4.2, rng.integers(3, 5)), 2)
    middle = rng.choice(["clamp", "u-bolt", "guide", "rest", "hanger"], len(bays) - 1)
    kinds = (rng.choice(["anchor", "nozzle"]), *middle, rng.choice(["clamp", "anchor"]))
    end = _taped(bays.sum())
    valves = [_valve(rng, rng.uniform(0.1, 0.9) * end) for _ in range(rng.integers(1, 3))]
    return _line(rng, end, list(zip(_ends(bays), kinds, strict=True)), valves)


def overhang(rng: Draw) -> Span:
    """A span that runs on beyond its last support to a valve at the free end."""
    bay, beyond = _taped(rng.uniform(2.0, 4.0)), _taped(rng.uniform(0.6, 1.8))
    kinds = rng.choice(["anchor", "nozzle", "clamp"]), rng.choice(["clamp", "u-bolt", "guide"])
    supports = list(zip((0.0, bay), kinds, strict=True))
    return _line(rng, _taped(bay + beyond), supports, [_valve(rng, bay + 0.95 * beyond)])


def small_bore(rng: Draw) -> Span:
    """A small branch on a header that carries a valve near its free end."""
    size = str(rng.choice(["3/4", "1", "1-1/2"]))
    length = _taped(rng.uniform(0.3, 0.8))
    valve = PointMass(_taped(rng.uniform(0.7, 0.95) * length), rng.uniform(2, 9), "valve", 0.15)
    legs = (Leg((1.0, 0.0, 0.0), length),)
    pipe, steel = standard_pipe(size, "80"), material("carbon steel")
    return Span(pipe, steel, legs, (Support(0.0, "nozzle"),), (valve,), 900.0)


FAMILIES: dict[str, Callable[[Draw], Span]] = {
    "single": single,
    "double": double,
    "several": several,
    "overhang": overhang,
    "small bore": small_bore,
}


def described(family: str, rng: Draw) -> Described:
    """A random job of a family."""
    span = FAMILIES[family](rng)
    fill = TAPPED_FILL[rng.choice(len(TAPPED_FILL), p=TAPPED_FILL_SHARE)]
    small = family == "small bore"
    between = (0.5, 1.0) if small else (0.15, 0.85)
    return Described(
        family,
        span,
        State("tapped", fill),
        State("running", (1.0, 1.0)),
        200.0 if small else 100.0,
        (between[0] * span.length_m, between[1] * span.length_m),
    )


def _line(
    rng: Draw, length: float, supports: list[tuple[float, str]], masses: list[PointMass]
) -> Span:
    size = str(rng.choice(["2", "3", "4", "6"]))
    return Span(
        standard_pipe(size, str(rng.choice(["40", "80"]))),
        material("carbon steel"),
        (Leg((1.0, 0.0, 0.0), length),),
        tuple(Support(float(at), str(kind)) for at, kind in supports),
        tuple(sorted(masses, key=lambda mass: mass.at_m)),
        float(rng.choice([998.0, 860.0])),
    )


def _taped(length_m: float) -> float:
    """To the centimetre."""
    return round(float(length_m), 2)


def _valve(rng: Draw, at_m: float) -> PointMass:
    tolerance = float(rng.choice([0.05, 0.1, 0.2]))
    return PointMass(_taped(at_m), float(rng.uniform(8, 45)), "valve", tolerance)


def _ends(bays: np.ndarray) -> list[float]:
    return [0.0, *(_taped(x) for x in np.cumsum(bays))]
