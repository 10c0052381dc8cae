"""How big a change is, as a number to rank by (common practice, no source).

1 is about one bracket welded to nearby steel; nothing here is a price.
"""

from __future__ import annotations

import math

from fieldkit.detune.excitation import Goal
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
from fieldkit.span.layout import Span
from fieldkit.span.supports import REFERENCE_DIAMETER_M

MOVE_BASE = 1.3
"""A new bracket, and the old one taken away."""
STIFFEN_BASE = 0.5
SUPPORT_BASE = 1.0
MASS_BASE = 0.4
MASS_SHARE_WEIGHT = 3.0
"""Per share of the pipe's own mass: heavy clamps load supports and sag the line."""
VALVE_BASE = 1.2
"""Taking out, changing or moving an item that is part of the line."""
SECOND_DIRECTION = 0.25
EASY_STIFFNESS_N_PER_M = 1e6
PER_DECADE = 0.5
PER_METRE_MOVED = 0.15


STEEL_NEAR = 0.8
"""Of a bracket where the job says there is steel to stand it on."""
TOGETHER = 0.3
"""Planning and proving two changes instead of one, for each further one."""
SPEED_BASE = 3.0
"""Whoever runs the machine gives something up, for good."""
ABSORBER_BASE = 2.5


def effort(change: Change, span: Span, goal: Goal | None = None) -> float:
    """Size of a change on this span; smaller is easier."""
    if isinstance(change, AllOf):
        sizes = [effort(part, span, goal) for part in change.parts]
        return sum(sizes) + TOGETHER * (len(sizes) - 1)
    near = goal is not None and goal.steel_near(_bracket_at(change, span))
    return (STEEL_NEAR if near else 1.0) * _single(change, span)


def _bracket_at(change: Change, span: Span) -> float | None:
    """Station of the steelwork a change needs; None where it needs none."""
    if isinstance(change, AddSupport):
        return change.at_m
    if isinstance(change, MoveSupport):
        return change.to_m
    return span.supports[change.index].at_m if isinstance(change, StiffenSupport) else None


def _single(change: Change, span: Span) -> float:
    if isinstance(change, AddSupport):
        return SUPPORT_BASE + _stiffness_effort(
            span, change.vertical_n_per_m, change.lateral_n_per_m, change.axial_n_per_m
        )
    if isinstance(change, StiffenSupport):
        return STIFFEN_BASE + _stiffness_effort(
            span, change.vertical_n_per_m, change.lateral_n_per_m, change.rotation_n_m_per_rad
        )
    if isinstance(change, MoveSupport):
        return MOVE_BASE + PER_METRE_MOVED * abs(change.to_m - span.supports[change.index].at_m)
    if isinstance(change, AddMass):
        return MASS_BASE + MASS_SHARE_WEIGHT * change.mass_kg / pipe_mass_kg(span)
    if isinstance(change, SetMass):
        old = span.masses[change.index].mass_kg
        return VALVE_BASE + abs(change.mass_kg - old) / old
    if isinstance(change, MoveMass):
        return VALVE_BASE + PER_METRE_MOVED * abs(change.to_m - span.masses[change.index].at_m)
    if isinstance(change, AddAbsorber):
        return ABSORBER_BASE + MASS_SHARE_WEIGHT * change.mass_kg / pipe_mass_kg(span)
    return SPEED_BASE if isinstance(change, ChangeSpeed) else SUPPORT_BASE


def pipe_mass_kg(span: Span) -> float:
    """Mass of the bare pipe wall."""
    return span.pipe.wall_area_m2 * span.material.density_kg_per_m3 * span.length_m


def _stiffness_effort(span: Span, *stiffness_n_per_m: float | None) -> float:
    stated = [k for k in stiffness_n_per_m if k]
    scale = span.pipe.outside_diameter_m / REFERENCE_DIAMETER_M
    decades = math.log10(max(*stated, 1.0) / (scale * EASY_STIFFNESS_N_PER_M))
    return PER_DECADE * max(0.0, decades) + SECOND_DIRECTION * (len(stated) - 1)
