"""Static answers against closed forms."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from fieldkit.errors import Refusal
from fieldkit.span.held import holding
from fieldkit.span.layout import Leg, PointMass, Span, State, Support
from fieldkit.span.materials import material
from fieldkit.span.pipes import standard_pipe
from fieldkit.span.static import GRAVITY_M_PER_S2, thermal_movement, weight_answer
from tests.reference.spans import anchored, level_span, square_legs

LENGTH_M = 6.0
COLD = State("tapped", (0.0, 0.0))
HOT = State("running", (1.0, 1.0), temperature_k=353.15)
FILLED = State("running", (1.0, 1.0))
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


def section_modulus_m3(span: Span) -> float:
    return 2 * span.pipe.second_moment_m4 / span.pipe.outside_diameter_m


def test_bending_of_a_pinned_span_is_w_l2_over_8_at_mid_span():
    """Beam tables (Gere and Timoshenko, Mechanics of Materials, from memory)."""
    span = pinned()
    found = weight_answer(span, FILLED)
    moment = weight_n_per_m(span) * LENGTH_M**2 / 8
    assert found.bending_stress_pa == pytest.approx(moment / section_modulus_m3(span), rel=1e-5)
    assert found.stressed_at_m == pytest.approx(LENGTH_M / 2)


def test_bending_of_a_clamped_span_is_w_l2_over_12_at_its_ends():
    """Beam tables (Gere and Timoshenko, from memory); shear leaves the end moments as they are."""
    span = replace(pinned(), supports=tuple(
        Support(at, "free", vertical=STIFF, lateral=STIFF, axial=STIFF, rotation=1e11, torsion=1e9)
        for at in (0.0, LENGTH_M)
    ))  # fmt: skip
    found = weight_answer(span, FILLED)
    moment = weight_n_per_m(span) * LENGTH_M**2 / 12
    assert found.bending_stress_pa == pytest.approx(moment / section_modulus_m3(span), rel=1e-4)


def test_bending_of_a_bent_cantilever_is_what_hangs_beyond_its_root():
    """Statics: two legs out of a wall, level and square; moment is weight times lever, twist left
    out. The bend is short; its cut corner moves the centre of gravity by less than 1 %."""
    legs = (Leg((1.0, 0.0, 0.0), 2.0), Leg((0.0, 1.0, 0.0), 1.0, 0.06))
    hold = Support(0.0, "free", STIFF, STIFF, STIFF, 1e11, torsion=1e11)
    span = replace(pinned(), legs=legs, supports=(hold,))
    w = weight_n_per_m(span)
    expected = w * (2.0 * 1.0 + 1.0 * 2.0) / section_modulus_m3(span)
    found = weight_answer(span, FILLED)
    assert found.bending_stress_pa == pytest.approx(expected, rel=0.015)
    assert found.stressed_at_m == 0.0


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
    force = np.linalg.norm(holding(span, COLD, HOT).load(LENGTH_M, "axial", stiffness).heat_n)
    assert force == pytest.approx(expected, rel=1e-3)


def test_nothing_moves_between_equal_states():
    assert np.allclose(thermal_movement(pinned(), COLD, COLD, 3.0), 0.0)


def test_a_new_prop_under_an_empty_line_carries_five_eighths_of_the_water():
    """Rigid prop at mid span, set empty, then filled: 5/8 of w L (beam tables, from memory)."""
    span = pinned()
    load = holding(span, COLD, FILLED).load(LENGTH_M / 2, "vertical", STIFF)
    water = GRAVITY_M_PER_S2 * span.pipe.bore_area_m2 * span.contents_density_kg_per_m3
    assert load.filling_n == pytest.approx([0, 0, 5 / 8 * water * LENGTH_M], rel=5e-3, abs=1e-6)
    assert load.heat_n == pytest.approx([0.0, 0.0, 0.0], abs=1e-6)


def test_a_rigid_stop_takes_the_whole_thermal_force():
    """No give at all: F = alpha dT L / (L/EA + 1/k of the anchor)."""
    span = pinned()
    modulus = span.material.modulus_at(HOT.temperature_k)
    give = LENGTH_M / (modulus * span.pipe.wall_area_m2) + 1 / STIFF
    expected = span.material.expansion_per_k * 60.0 * LENGTH_M / give
    load = holding(span, COLD, HOT).load(LENGTH_M, "axial", math.inf)
    assert load.heat_n == pytest.approx([-expected, 0.0, 0.0], rel=1e-3)


def test_a_riser_between_levels_lifts_off_what_stands_beside_it():
    """An L that rises 3 m grows up by alpha dT h at its top, less what the leg across holds."""
    legs = square_legs([3.0, 1.0], ["+z", "+x"], 0.15)
    span = Span(pinned().pipe, pinned().material, legs, (anchored(0.0),))
    growth = span.material.expansion_per_k * 60.0
    assert thermal_movement(span, COLD, HOT, 4.0) == pytest.approx(
        [growth * 1.0, 0.0, growth * 3.0], abs=1e-6
    )


def test_a_cantilever_with_a_mass_sags_at_its_tip():
    """M g L^3/3EI beside the pipe's own w L^4/8EI; shear adds less than 1 %."""
    span = level_span(3.0, [anchored(0.0)], (PointMass(3.0, 20.0),), pipe=pinned().pipe)
    answer = weight_answer(span, COLD)
    rigidity = 2e11 * span.pipe.second_moment_m4
    own = weight_n_per_m(span) * 3.0**4 / 8
    expected = (20.0 * GRAVITY_M_PER_S2 * 3.0**3 / 3 + own) / rigidity
    assert answer.sag_m == pytest.approx(expected, rel=1e-2)
    assert answer.sag_at_m == pytest.approx(3.0)


SIDEWAYS = PointMass(3.0, 5.0, offset_m=(0.0, 0.4, 0.0))


@pytest.mark.parametrize(
    ("supports", "words"),
    [
        ((), "do not hold the span up"),
        ((Support(0.0, "free", lateral=STIFF, axial=STIFF),), "do not hold the span up"),
        ((Support(2.0, "free", vertical=STIFF),), "do not hold the span up"),
        ((Support(0.0, "rest"), Support(6.0, "rest")), "turning over"),
    ],
)
def test_a_span_that_falls_is_refused(supports, words):
    """No support, none upward, one on which it see-saws, or rests under a mass at the side."""
    fallen = replace(pinned(), supports=supports, masses=(SIDEWAYS,))
    with pytest.raises(Refusal, match=words):
        weight_answer(fallen, HOT)
