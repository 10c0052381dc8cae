"""Static answers against closed forms."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.span.layout import Leg, Span, State, Support
from fieldkit.span.materials import material
from fieldkit.span.pipes import standard_pipe
from fieldkit.span.static import (
    GRAVITY_M_PER_S2,
    restraint_force,
    thermal_movement,
    weight_answer,
)

LENGTH_M = 6.0
COLD = State("tapped", (0.0, 0.0))
HOT = State("running", (1.0, 1.0), temperature_k=353.15)
STIFF = 1e11


def pinned() -> Span:
    """A water line on two supports, free to slide at the far one."""
    return Span(
        standard_pipe("NPS 4", "40"),
        material("carbon steel"),
        (Leg((1.0, 0.0, 0.0), LENGTH_M),),
        (
            Support(0.0, "free", vertical=STIFF, lateral=STIFF, axial=STIFF, torsion=1e9),
            Support(LENGTH_M, "free", vertical=STIFF, lateral=STIFF),
        ),
        contents_density_kg_per_m3=1000.0,
    )


def weight_n_per_m(span: Span) -> float:
    pipe = span.pipe.wall_area_m2 * span.material.density_kg_per_m3
    return GRAVITY_M_PER_S2 * (pipe + span.pipe.bore_area_m2 * span.contents_density_kg_per_m3)


def test_sag_of_a_pinned_span_is_5_w_l4_over_384_e_i():
    """Beam tables (Gere and Timoshenko, Mechanics of Materials, from memory); shear adds 0.2 %."""
    span = pinned()
    answer = weight_answer(span, HOT)
    modulus = span.material.modulus_at(HOT.temperature_k)
    rigidity = modulus * span.pipe.second_moment_m4
    assert answer.sag_m == pytest.approx(
        5 * weight_n_per_m(span) * LENGTH_M**4 / (384 * rigidity), rel=4e-3
    )
    assert answer.sag_at_m == pytest.approx(LENGTH_M / 2)


def test_the_supports_carry_the_whole_weight_upward():
    span = pinned()
    loads = [force for _, force in weight_answer(span, HOT).support_loads]
    assert loads[0] == pytest.approx([0.0, 0.0, weight_n_per_m(span) * LENGTH_M / 2], abs=1e-2)
    assert sum(loads)[2] == pytest.approx(weight_n_per_m(span) * LENGTH_M, rel=1e-5)


def test_a_line_free_to_slide_grows_by_alpha_dt_l():
    span = pinned()
    growth = span.material.expansion_per_k * 60.0 * LENGTH_M
    assert thermal_movement(span, COLD, HOT, LENGTH_M) == pytest.approx([growth, 0, 0], abs=1e-9)
    assert thermal_movement(span, COLD, HOT, LENGTH_M / 2)[0] == pytest.approx(growth / 2)


@pytest.mark.parametrize("stiffness", [1e5, 1e7, 1e9])
def test_a_spring_against_growth_carries_k_times_what_it_lets_through(stiffness):
    """Two springs in series, pipe EA/L and restraint k: F = alpha dT L / (L/EA + 1/k)."""
    span = pinned()
    modulus = span.material.modulus_at(HOT.temperature_k)
    pipe_flexibility = LENGTH_M / (modulus * span.pipe.wall_area_m2) + 1 / STIFF
    growth = span.material.expansion_per_k * 60.0 * LENGTH_M
    expected = growth / (pipe_flexibility + 1 / stiffness)
    force = restraint_force(span, COLD, HOT, LENGTH_M, "axial", stiffness)
    assert force == pytest.approx(expected, rel=1e-3)


def test_nothing_moves_between_equal_states():
    assert np.allclose(thermal_movement(pinned(), COLD, COLD, 3.0), 0.0)
