"""Exact frequencies of a straight level span with every value known: none of the span model in it.

Bending in two planes by dynamic stiffness (Timoshenko), motion along the pipe by the dynamic
stiffness of a rod, both counted after Wittrick and Williams. Shear coefficient of a tube: Cowper
1966, J. Appl. Mech. 33, 335.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fieldkit.span.layout import Span, State
from tests.reference.dynamic_stiffness import (
    Attachment,
    Beam,
    deflections,
    mode_count,
    natural_frequencies_hz,
)

PLANES = ("vertical", "lateral")
DIRECTIONS = (*PLANES, "axial")
ENOUGH = 1e-7
STIFF_N_PER_M = 1e12
SLOWEST_HZ = 0.2
"""Slower than this is a free direction, not a vibration."""


@dataclass(frozen=True)
class ExactMode:
    """A natural frequency and the direction of its motion."""

    frequency_hz: float
    direction: str
    solved_hz: float
    """Before anything no beam has was added to it."""


def exact_modes(span: Span, state: State, below_hz: float) -> tuple[ExactMode, ...]:
    """Every mode of a span whose supports state each stiffness, in rising order."""
    found = [
        ExactMode(float(f), direction, float(f))
        for direction in DIRECTIONS
        for f in frequencies(span, state, direction, below_hz)
        if f > SLOWEST_HZ
    ]
    return tuple(sorted(found, key=lambda mode: mode.frequency_hz))


def frequencies(span: Span, state: State, direction: str, below_hz: float) -> np.ndarray:
    """Those of one direction."""
    if direction == "axial":
        return rod_frequencies(span, state, below_hz)
    beam, held = beam_of(span, state), attachments(span, direction)
    count = mode_count(beam, span.length_m, held, below_hz)
    if not count:
        return np.empty(0)
    return natural_frequencies_hz(beam, span.length_m, held, count, ENOUGH)


def motion(
    span: Span, state: State, direction: str, frequency_hz: np.ndarray, at_m: Sequence[float]
) -> np.ndarray:
    """Deflection (modes, stations) of modes of one plane."""
    held = attachments(span, direction)
    return deflections(beam_of(span, state), span.length_m, held, frequency_hz, at_m)


def beam_of(span: Span, state: State) -> Beam:
    """The pipe wall bends and turns; contents move across with it and do not turn."""
    outside = span.pipe.outside_diameter_m
    inside = outside - 2 * span.pipe.wall_m
    area, bore = math.pi / 4 * (outside**2 - inside**2), math.pi / 4 * inside**2
    second_moment = math.pi / 64 * (outside**4 - inside**4)
    modulus, nu = modulus_of(span, state), span.material.poisson
    m = (1 + (inside / outside) ** 2) ** 2
    kappa = 6 * (1 + nu) * m / ((7 + 6 * nu) * m + (20 + 12 * nu) * (inside / outside) ** 2)
    density = span.material.density_kg_per_m3
    return Beam(
        bending_n_m2=modulus * second_moment,
        mass_kg_per_m=density * area + state.fill[0] * span.contents_density_kg_per_m3 * bore,
        shear_n=kappa * modulus / (2 * (1 + nu)) * area,
        rotary_kg_m=density * second_moment,
    )


def modulus_of(span: Span, state: State) -> float:
    """At the temperature of the state, linear between the table's entries."""
    temperature, modulus = zip(*span.material.modulus_pa, strict=True)
    return float(np.interp(state.temperature_k, temperature, modulus))


def attachments(span: Span, direction: str) -> list[Attachment]:
    """Springs and masses as one plane meets them."""
    held = [
        Attachment(s.at_m, _stated(getattr(s, direction)), _stated(s.rotation))
        for s in span.supports
    ]
    return held + [Attachment(m.at_m, mass_kg=m.mass_kg) for m in span.masses]


def _stated(stiffness: float | str) -> float:
    if isinstance(stiffness, str):
        return 0.0
    return min(float(stiffness), STIFF_N_PER_M)


def rod_frequencies(span: Span, state: State, below_hz: float) -> np.ndarray:
    """Along the pipe, by bisection on the count."""
    count = int(_rod_count(span, state, np.array([below_hz]))[0])
    low, high = np.zeros(count), np.full(count, below_hz)
    wanted = np.arange(1, count + 1)
    for _ in range(40):
        middle = 0.5 * (low + high)
        enough = _rod_count(span, state, middle) >= wanted
        low, high = np.where(enough, low, middle), np.where(enough, middle, high)
    return 0.5 * (low + high)


def _rod_count(span: Span, state: State, below_hz: np.ndarray) -> np.ndarray:
    """How many modes along the pipe lie below each frequency."""
    beam = beam_of(span, state)
    area = math.pi * (span.pipe.outside_diameter_m - span.pipe.wall_m) * span.pipe.wall_m
    stiff = modulus_of(span, state) * area
    held = attachments(span, "axial")
    station = np.unique([0.0, span.length_m, *(a.at_m for a in held)])
    station = station[np.concatenate([[True], np.diff(station) > 1e-9])]
    omega = 2 * math.pi * np.maximum(below_hz, 1e-6)
    wave = omega[:, None] * math.sqrt(beam.mass_kg_per_m / stiff)
    angle = wave * np.diff(station)
    whole = np.zeros((len(omega), len(station), len(station)))
    own, across = stiff * wave / np.tan(angle), -stiff * wave / np.sin(angle)
    for i in range(len(station) - 1):
        whole[:, i, i] += own[:, i]
        whole[:, i + 1, i + 1] += own[:, i]
        whole[:, i, i + 1] += across[:, i]
        whole[:, i + 1, i] += across[:, i]
    for a in held:
        row = int(np.argmin(np.abs(station - a.at_m)))
        whole[:, row, row] += a.spring_n_per_m - a.mass_kg * omega**2
    held_at_both_ends = np.floor(angle / math.pi).astype(int).sum(axis=1)
    return held_at_both_ends + np.sum(np.linalg.eigvalsh(whole) < 0, axis=1)
