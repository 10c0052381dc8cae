"""What a support puts on the pipe: what is stated replaces what the kind implies."""

from __future__ import annotations

import math

import pytest

from fieldkit.errors import InputError
from fieldkit.span.layout import PointMass, Span, Support
from fieldkit.span.materials import material
from fieldkit.span.pipes import standard_pipe
from fieldkit.span.supports import KINDS, RIGID_N_PER_M, UNKNOWN_SD_LN, Spring, springs
from tests.reference.spans import level_span, square_legs

PIPE = standard_pipe("NPS 4", "40")
STEEL = material("carbon steel")


def by_axis(*supports: Support, riser: bool = False, masses=()) -> dict[str, Spring]:
    """Springs of the first support on a 4 m line of NPS 4, level or rising, by axis."""
    legs = square_legs([4.0], ["+z" if riser else "+x"], None)
    span = Span(PIPE, STEEL, legs, supports, masses)
    found = [spring for spring in springs(span) if spring.support == 0]
    assert len({spring.axis for spring in found}) == len(found)
    return {spring.axis: spring for spring in found}


def test_a_kind_implies_its_row():
    """On a 4-inch pipe the table holds as it stands."""
    clamp = by_axis(Support(1.0, "clamp"))
    assert set(clamp) == {"vertical", "lateral", "axial", "rotation", "torsion"}
    assert clamp["vertical"].stiffness == pytest.approx(1.5e7)
    assert clamp["lateral"].stiffness == pytest.approx(8e6)
    assert clamp["vertical"].sd_ln == 1.3


def test_stiffness_grows_with_the_pipe():
    small = level_span(4.0, [Support(1.0, "rest")], pipe=standard_pipe("1", "40"))
    vertical = next(spring for spring in springs(small) if spring.axis == "vertical")
    assert vertical.stiffness == pytest.approx(6e6 * 33.4 / 114.3)


def test_rotation_counts_in_4_ei_over_l_of_the_spans_beside():
    """A clamp in the middle of 4 m: L is 2 m on either side."""
    unit = 4 * STEEL.modulus_pa[0][1] * PIPE.second_moment_m4 / 2.0
    assert by_axis(Support(2.0, "clamp"))["rotation"].stiffness == pytest.approx(0.4 * unit)


def test_another_support_stated_in_full_leaves_the_others_as_they_were():
    """A support added as a cure does not change how stiff the old anchor is."""
    alone = by_axis(Support(0.0, "anchor"))
    joined = by_axis(Support(0.0, "anchor"), Support(1.0, "free", vertical=1e6))
    assert joined == alone


def test_a_stated_direction_replaces_what_the_kind_implies():
    clamp = by_axis(Support(1.0, "clamp", vertical=2e6, lateral="unknown", axial=0.0))
    assert clamp["vertical"].stiffness == 2e6
    assert clamp["vertical"].sd_ln == 0.0
    assert clamp["lateral"].stiffness == pytest.approx(8e6)
    assert clamp["lateral"].sd_ln == UNKNOWN_SD_LN
    assert "axial" not in clamp


def test_x_y_z_stand_in_for_the_named_directions():
    """z on a level pipe is its vertical, x along it its axial."""
    clamp = by_axis(Support(1.0, "clamp", z=3e6, x="unknown"))
    assert set(clamp) == {"lateral", "rotation", "torsion", "x", "z"}
    assert clamp["z"].stiffness == 3e6


def test_on_a_riser_vertical_and_axial_are_one():
    """Stated once, it is there once; a clamp holds both horizontals across and z along."""
    implied = by_axis(Support(1.0, "clamp"), riser=True)
    assert set(implied) == {"lateral", "axial", "rotation", "torsion"}
    assert implied["lateral"].stiffness == pytest.approx(8e6)
    stated = by_axis(Support(1.0, "clamp", vertical=5e6), riser=True)
    assert set(stated) == {"lateral", "vertical", "rotation", "torsion"}


def test_on_a_riser_one_horizontal_stated_leaves_the_other_implied():
    clamp = by_axis(Support(1.0, "clamp", x=1e6), riser=True)
    assert clamp["x"].stiffness == 1e6
    assert clamp["y"].stiffness == pytest.approx(8e6)
    assert "lateral" not in clamp


def test_a_rest_under_a_riser_holds_it_up():
    rest = by_axis(Support(1.0, "rest"), riser=True)
    assert rest["vertical"].stiffness == pytest.approx(6e6)
    assert "axial" not in rest


def test_rigid_is_very_stiff_and_sure():
    rigid = by_axis(Support(1.0, "free", vertical=math.inf))["vertical"]
    assert (rigid.stiffness, rigid.sd_ln) == (RIGID_N_PER_M, 0.0)


def test_unknown_where_the_kind_implies_nothing_is_widely_doubted():
    turning = by_axis(Support(1.0, "guide", rotation="unknown"))["rotation"]
    assert turning.stiffness > 0
    assert turning.sd_ln >= UNKNOWN_SD_LN


def test_twist_is_doubtful_only_where_it_matters():
    """An offset mass couples twist with bending; a bare straight line does not."""
    valve = PointMass(2.0, 20.0, offset_m=(0.0, 0.0, 0.2))
    assert by_axis(Support(0.0, "anchor"))["torsion"].sd_ln == 0.0
    assert by_axis(Support(0.0, "anchor"), masses=(valve,))["torsion"].sd_ln == 1.8


def test_a_support_that_may_turn_across_still_grips():
    """Rotation stated free pins the pipe; the clamp's grip against twist stays."""
    pinned = by_axis(Support(0.0, "clamp", rotation=0.0))
    assert "rotation" not in pinned
    assert pinned["torsion"].stiffness > 0
    assert "torsion" not in by_axis(Support(0.0, "rest"))


def test_an_unknown_kind_lists_the_known_ones():
    with pytest.raises(InputError, match="no support is called 'bungee'") as raised:
        by_axis(Support(0.0, "bungee"))
    assert all(kind in raised.value.remedy for kind in KINDS)
    assert raised.value.place.field == "support[0].kind"
