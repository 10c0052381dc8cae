"""What a metre of a span's pipe weighs and how stiff it is in a state."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.span import elements
from fieldkit.span.layout import Insulation, Span, State

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Line:
    """Rigidities and masses per length of straight pipe."""

    bending_n_m2: float
    shear_n: float
    axial_n: float
    torsion_n_m2: float
    own_mass_kg_per_m: float
    """Pipe and insulation."""
    contents_kg_per_m: float
    """Bore full."""
    rotary_inertia_kg_m: float
    """Pipe and insulation about a diameter; about the axis it is twice that. The contents move
    along but do not turn with the pipe."""
    outside_diameter_m: float

    @property
    def full_mass_kg_per_m(self) -> float:
        """With the bore full."""
        return self.own_mass_kg_per_m + self.contents_kg_per_m


def line_of(span: Span, state: State) -> Line:
    """The pipe of a span at the temperature of a state."""
    pipe, material = span.pipe, span.material
    modulus = material.modulus_at(state.temperature_k)
    shear_modulus = material.shear_modulus_at(state.temperature_k)
    bore_ratio = pipe.bore_m / pipe.outside_diameter_m
    kappa = elements.cowper_shear_coefficient(bore_ratio, material.poisson)
    layer_mass, layer_inertia = _layer(span.insulation, pipe.outside_diameter_m)
    return Line(
        bending_n_m2=modulus * pipe.second_moment_m4,
        shear_n=kappa * shear_modulus * pipe.wall_area_m2,
        axial_n=modulus * pipe.wall_area_m2,
        torsion_n_m2=shear_modulus * 2 * pipe.second_moment_m4,
        own_mass_kg_per_m=material.density_kg_per_m3 * pipe.wall_area_m2 + layer_mass,
        contents_kg_per_m=span.contents_density_kg_per_m3 * pipe.bore_area_m2,
        rotary_inertia_kg_m=material.density_kg_per_m3 * pipe.second_moment_m4 + layer_inertia,
        outside_diameter_m=pipe.outside_diameter_m,
    )


def flexibility_of(span: Span, state: State, radius_m: Array) -> Array:
    """Factor by which bends of these radii bend more than straight pipe; 1 where infinite."""
    pipe, modulus = span.pipe, span.material.modulus_at(state.temperature_k)
    return elements.bend_flexibility(
        radius_m, pipe.mean_radius_m, pipe.wall_m, state.pressure_pa, modulus
    )


def _layer(insulation: Insulation | None, inside_m: float) -> tuple[float, float]:
    """Mass and rotary inertia of the insulation per metre."""
    if insulation is None:
        return 0.0, 0.0
    outside_m = inside_m + 2 * insulation.thickness_m
    area = math.pi / 4 * (outside_m**2 - inside_m**2)
    second_moment = math.pi / 64 * (outside_m**4 - inside_m**4)
    return insulation.density_kg_per_m3 * area, insulation.density_kg_per_m3 * second_moment
