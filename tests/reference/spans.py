"""Spans the checks share: level straight pipes with ideal ends, and how their modes read."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np

from fieldkit.span.layout import Leg, PointMass, Span, State, Support
from fieldkit.span.materials import Material
from fieldkit.span.modes import Mode, span_modes
from fieldkit.span.pipes import PipeSection

STEEL = Material("test steel", 7850.0, 0.3, ((293.15, 2.0e11),), 0.0)
SLENDER = PipeSection(0.020, 0.002)
"""So thin that 6 m of it knows no shear (L/D = 300)."""
STATE = State("tapped", fill=(0.0, 0.0))
RIGID = math.inf


def hold(at_m: float, ends: str = "pinned", stiffness: float = RIGID) -> Support:
    """A rigid hold against translation that is ``pinned`` or ``clamped``."""
    rotation = stiffness if ends == "clamped" else 0.0
    return Support(at_m, "free", stiffness, stiffness, stiffness, rotation)


def anchored(at_m: float) -> Support:
    """A hold as rigid as the model allows against every motion, twist included."""
    stiff = math.inf
    return Support(at_m, "free", stiff, stiff, stiff, stiff, torsion=stiff)


def level_span(
    length_m: float,
    supports: list[Support],
    masses: tuple[PointMass, ...] = (),
    pipe: PipeSection = SLENDER,
    material: Material = STEEL,
) -> Span:
    """A straight level pipe along x."""
    return Span(pipe, material, (Leg((1.0, 0.0, 0.0), length_m),), tuple(supports), masses)


def square_legs(
    lengths: list[float], directions: list[str], radius_m: float | None
) -> tuple[Leg, ...]:
    """Legs along signed axes, such as ``+x``, with one bend radius; None for sharp corners."""
    legs = []
    for i, (length, name) in enumerate(zip(lengths, directions, strict=True)):
        axis = [0.0, 0.0, 0.0]
        axis["xyz".index(name[1])] = -1.0 if name[0] == "-" else 1.0
        x, y, z = axis
        legs.append(Leg((x, y, z), length, None if i == 0 else radius_m))
    return tuple(legs)


def unit_hz(span: Span, length_m: float) -> float:
    """Frequency of the eigenvalue 1: sqrt(EI/m)/(2 pi L^2)."""
    stiffness = span.material.modulus_pa[0][1] * span.pipe.second_moment_m4
    mass = span.material.density_kg_per_m3 * span.pipe.wall_area_m2
    return math.sqrt(stiffness / mass) / (2 * math.pi * length_m**2)


def vertical_hz(span: Span, count: int, up_to_hz: float) -> np.ndarray:
    """The lowest vertical modes of the span model."""
    return frequencies_hz(span_modes(span, STATE, up_to_hz), "vertical", count)


def frequencies_hz(modes: tuple[Mode, ...], direction: str, count: int) -> np.ndarray:
    """Modes of one direction in rising order, shape (count,)."""
    found = [mode.frequency_hz for mode in modes if mode.direction == direction]
    assert len(found) >= count, f"only {len(found)} modes {direction}"
    assert all(a <= b for a, b in pairwise(found))
    return np.array(found[:count])
