"""Random spans for property checks, and how to mesh one finer."""

from __future__ import annotations

import math

import numpy as np

from fieldkit.span.layout import Leg, PointMass, Span, State, Support
from fieldkit.span.materials import material
from fieldkit.span.pipes import standard_pipe
from fieldkit.span.structure import Structure, assemble

FULL = State("running", (1.0, 1.0))
SIZES = ("1/2", "1", "2", "3", "6", "12")
KINDS = ("anchor", "clamp", "u-bolt", "guide", "rest", "hanger")
AXES = np.concatenate([np.eye(3), -np.eye(3)])


def drawn_span(seed: int, bends: int) -> Span:
    """A water line of one leg more than it has bends, with random supports and masses."""
    rng = np.random.default_rng(seed)
    pipe = standard_pipe(str(rng.choice(SIZES)), str(rng.choice(["10S", "40", "80"])))
    diameter = pipe.outside_diameter_m
    direction = AXES[rng.integers(6)]
    legs = [Leg(_vector(direction), diameter * rng.uniform(8, 60))]
    for _ in range(bends):
        across = AXES[np.abs(AXES @ direction) < 0.5]
        direction = across[rng.integers(len(across))]
        length, radius = diameter * rng.uniform(8, 60), diameter * rng.uniform(1, 4)
        legs.append(Leg(_vector(direction), length, radius))
    end = sum(leg.length_m for leg in legs)
    between = [Support(rng.uniform(0, end), str(rng.choice(KINDS))) for _ in range(2)]
    steel_kg = 7850 * pipe.wall_area_m2 * end
    masses = [
        PointMass(rng.uniform(0, end), steel_kg * rng.uniform(), offset_m=(0, 0, 2 * diameter))
        for _ in range(rng.integers(0, 3))
    ]
    supports = (Support(0.0, "anchor"), *between, Support(end, str(rng.choice(KINDS))))
    return Span(pipe, material("carbon steel"), tuple(legs), supports, tuple(masses), 998.0)


def limit_hz(span: Span, pinned_mode: float) -> float:
    """Frequency of the (fractional) pinned mode of the whole length, within beam theory."""
    pipe = span.pipe
    rigidity = 203e9 * pipe.second_moment_m4
    mass = 7850 * pipe.wall_area_m2 + 998 * pipe.bore_area_m2
    bending = (pinned_mode * math.pi / span.length_m) ** 2 * math.sqrt(rigidity / mass)
    wavelength = 12 * pipe.outside_diameter_m
    short = (2 * math.pi / wavelength) ** 2 * math.sqrt(rigidity / mass)
    return min(bending, short) / (2 * math.pi)


def four_times_finer(structure: Structure, up_to_hz: float) -> Structure:
    """The same span with every element cut in four."""
    station = structure.station_m
    cuts = [station[:-1] + share * np.diff(station) for share in (0.0, 0.25, 0.5, 0.75)]
    extra = tuple(np.concatenate(cuts))
    span, state = structure.span, structure.state
    return assemble(span, state, up_to_hz=up_to_hz, extra_stations_m=extra)


def _vector(direction: np.ndarray) -> tuple[float, float, float]:
    x, y, z = (float(part) for part in direction)
    return x, y, z
