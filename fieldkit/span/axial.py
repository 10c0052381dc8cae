"""Axial force of a span from pressure and restrained heat.

Effective axial force S = N - p A_bore, N the wall's own force, tension positive: it is S that
stiffens or softens a pipe sideways (Sparks 1984, J. Energy Resources Technology 106, 46). With the
hoop stretch of a pressurised bore S = EA (u' - e), where the free strain
e = alpha dT + (1 - 2 nu) p A_bore / (EA): a span free to move along itself has S = 0, one that is
fully held has S = -EA alpha dT - (1 - 2 nu) p A_bore. This takes the line as closed or carried on
beyond both ends; an expansion joint without tie rods is outside it. Heat counts from the
temperature at which the line was built, taken as 20 degC.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import Refusal
from fieldkit.span import elements as element
from fieldkit.span.factor import Factor, rounding_floor
from fieldkit.span.layout import Span, State
from fieldkit.span.restraint import span_matrices
from fieldkit.span.supports import springs

if TYPE_CHECKING:
    from fieldkit.span.structure import Structure

Array = NDArray[np.float64]

BUILT_AT_K = 293.15


def free_strain(span: Span, state: State) -> float:
    """Axial strain of the unrestrained pipe against the pipe as built: heat and pressure."""
    rigidity = span.material.modulus_at(state.temperature_k) * span.pipe.wall_area_m2
    heat = span.material.expansion_per_k * (state.temperature_k - BUILT_AT_K)
    thrust = (1 - 2 * span.material.poisson) * state.pressure_pa * span.pipe.bore_area_m2
    return heat + thrust / rigidity


def growth(structure: Structure) -> Array:
    """Displacement (6N,) that heat and pressure cause against the supports at their medians."""
    strain = np.full(len(structure.element_length_m), free_strain(structure.span, structure.state))
    load = _gathered(element.axial_strain_load(structure.elements, strain))
    stiffness, mass = span_matrices(structure, springs(structure.span), structure.span.masses)
    steadied = stiffness + rounding_floor(stiffness, mass) * mass
    return Factor(steadied).solve(load)


def effective_force(structure: Structure) -> Array:
    """Effective axial force (E,) in newtons of a structure assembled without it."""
    strain = free_strain(structure.span, structure.state)
    if strain == 0.0:
        return np.zeros(len(structure.element_length_m))
    moved = _scattered(growth(structure))
    held = element.axial_strain(structure.elements, moved) - strain
    force: Array = structure.elements.axial_rigidity_n * held
    return force


def refuse_buckled(structure: Structure) -> None:
    """Refusal where the loaded structure with its supports has no stable equilibrium."""
    stiffness, mass = span_matrices(structure, springs(structure.span), structure.span.masses)
    if Factor(stiffness + rounding_floor(stiffness, mass) * mass).negatives:
        raise buckled(structure)


def buckled(structure: Structure) -> Refusal:
    """What to say of a structure that its axial force has buckled."""
    worst = int(np.argmin(structure.axial_force_n))
    force_kn = -structure.axial_force_n[worst] / 1e3
    celsius = structure.state.temperature_k - 273.15
    bar = structure.state.pressure_pa / 1e5
    return Refusal(
        f"with these supports the pipe buckles in the {structure.state.name} state: at "
        f"{celsius:.0f} degC and {bar:.0f} bar it would carry {force_kn:.1f} kN of compression at "
        f"{structure.element_station_m[worst]:.2f} m",
        "state how stiff the supports really are along the pipe (axial), or add a guide",
    )


def _gathered(loads: Array) -> Array:
    """Element loads (E, 12) added into one vector (6N,)."""
    nodal = np.zeros((len(loads) + 1, 6))
    nodal[:-1] += loads[:, :6]
    nodal[1:] += loads[:, 6:]
    return nodal.ravel()


def _scattered(displacement: Array) -> Array:
    """A displacement (6N,) as the elements see it, (E, 12)."""
    nodal = displacement.reshape(-1, 6)
    return np.concatenate([nodal[:-1], nodal[1:]], axis=1)
