"""Dynamic bending stress of a straight pipe span from the velocity of its vibration.

In a mode sigma = E (D/2) phi'' and v = omega phi with omega^2 = beta^4 E I / m, so that
sigma/v = c sqrt(E rho) (D/2) / r_g sqrt(m / m_pipe) with c = max|phi''| / (beta^2 max|phi|) and
r_g^2 = I/A: frequency and length drop out. Used for piping by Wachel, Morton and Atkins 1990,
Proc. 19th Turbomachinery Symposium, 119 (from memory).
"""

from __future__ import annotations

import math

from fieldkit.span.gaps import uniform_pipe
from fieldkit.span.layout import Span, State

SHAPE_FACTOR = {
    "cantilever": 1.0,
    "pinned-pinned": 1.0,
    "fixed-pinned": 1.32518,
    "fixed-fixed": 1.25933,
}
"""c of the first mode of a uniform straight span, from the closed-form mode shapes."""
HIGHEST_SHAPE_FACTOR = max(SHAPE_FACTOR.values())


def carried_mass_ratio(span: Span, state: State) -> float:
    """Mass of pipe, contents and insulation over that of the bare pipe, per length."""
    bare = span.material.density_kg_per_m3 * span.pipe.wall_area_m2
    return uniform_pipe(span, state).mass_kg_per_m / bare


def stress_per_velocity(
    span: Span, state: State, shape_factor: float = HIGHEST_SHAPE_FACTOR
) -> float:
    """Pa per m/s: nominal bending stress over the highest velocity of the span."""
    pipe, material = span.pipe, span.material
    wave = math.sqrt(material.modulus_at(state.temperature_k) * material.density_kg_per_m3)
    gyration = math.sqrt(pipe.second_moment_m4 / pipe.wall_area_m2)
    slender = 0.5 * pipe.outside_diameter_m / gyration
    return shape_factor * wave * slender * math.sqrt(carried_mass_ratio(span, state))
