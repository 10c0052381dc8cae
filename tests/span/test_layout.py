"""The description of a span: stations, directions, and contradictions in plain words."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.errors import InputError
from fieldkit.span.layout import Leg, PointMass, Span, Support, axis_vectors
from fieldkit.span.materials import material
from fieldkit.span.pipes import PipeSection
from tests.reference.spans import square_legs

PIPE = PipeSection(0.0889, 0.00549)
STEEL = material("carbon steel")
X = (1.0, 0.0, 0.0)


def span_of(legs, supports=(), masses=()) -> Span:
    return Span(PIPE, STEEL, tuple(legs), tuple(supports), tuple(masses))


def test_a_bend_cuts_the_corner_and_stations_run_past_it_evenly():
    """R = 0.5 into +y: arc of pi/4 in length on 1.0 m of station, half way at 45 degrees."""
    line = span_of(square_legs([2.0, 3.0], ["+x", "+y"], 0.5)).centre_line
    assert [piece.arc_length_m for piece in line.pieces] == pytest.approx([1.5, math.pi / 4, 2.5])
    position, tangent = line.at(2.0)
    inside = 0.5 * (1 - math.sqrt(0.5))
    assert position == pytest.approx([2.0 - inside, inside, 0.0])
    assert tangent == pytest.approx([math.sqrt(0.5), math.sqrt(0.5), 0.0])
    assert line.at(5.0)[0] == pytest.approx([2.0, 3.0, 0.0])


@settings(max_examples=30, deadline=None)
@given(st.floats(0.01, 4.99), st.floats(20, 170), st.floats(0.05, 0.16))
def test_the_centre_line_is_smooth(station, degrees, radius):
    """Any angle of bend: no jump in place or direction, unit tangents."""
    angle = math.radians(degrees)
    second = (math.cos(angle), 0.0, math.sin(angle))
    line = span_of([Leg(X, 2.0), Leg(second, 3.0, radius)]).centre_line
    (before, t1), (after, t2) = line.at(station - 1e-5), line.at(station + 1e-5)
    assert np.linalg.norm(after - before) < 2.1e-5
    assert np.linalg.norm(t2 - t1) < 2.1e-5 / radius * 12
    assert np.linalg.norm(t1) == pytest.approx(1.0)


@pytest.mark.parametrize(
    ("tangent", "vertical", "lateral"),
    [
        (X, (0, 0, 1), (0, 1, 0)),
        ((0.6, 0.0, 0.8), (-0.8, 0, 0.6), (0, 1, 0)),
        ((0.0, -1.0, 0.0), (0, 0, 1), (1, 0, 0)),
    ],
)
def test_vertical_is_the_way_across_nearest_to_up(tangent, vertical, lateral):
    line = np.array(tangent)
    assert axis_vectors(line, "vertical")[0] == pytest.approx(np.array(vertical))
    assert axis_vectors(line, "lateral")[0] == pytest.approx(np.array(lateral))
    assert axis_vectors(line, "axial")[0] == pytest.approx(line)
    assert axis_vectors(line, "torsion")[0] == pytest.approx(line)
    assert axis_vectors(line, "rotation") @ line == pytest.approx([0.0, 0.0])


def test_on_a_riser_lateral_is_both_horizontals():
    up = np.array([0.0, 0.0, -1.0])
    assert axis_vectors(up, "lateral") == pytest.approx(np.eye(3)[:2])
    assert axis_vectors(up, "vertical") == pytest.approx(np.eye(3)[2:])
    assert axis_vectors(up, "axial") == pytest.approx(np.eye(3)[2:])


@pytest.mark.parametrize(
    ("legs", "extra", "field", "words"),
    [
        ([], {}, "leg", "no leg"),
        ([Leg(X, 0.0)], {}, "leg[0].length", "leg of 0 m"),
        ([Leg(X, math.nan)], {}, "leg[0].length", "leg of nan m"),
        ([Leg((1.0, 1.0, 0.0), 2.0)], {}, "leg[0].direction", "no unit vector"),
        ([Leg(X, 2.0), Leg((-1.0, 0.0, 0.0), 1.0)], {}, "leg[1].direction", "straight back"),
        (square_legs([0.2, 0.2], ["+x", "+y"], 0.3), {}, "leg[0].length", "bends take 0.300 m"),
        (square_legs([1.0, 1.0], ["+x", "+y"], 0.04), {}, "leg[1].bend_radius", "40 mm does not"),
        (
            [Leg(X, 2.0)],
            {"supports": [Support(2.1, "rest")]},
            "support[0].at",
            "2.1 m lies outside",
        ),
        ([Leg(X, 2.0)], {"masses": [PointMass(-0.1, 3.0)]}, "mass[0].at", "outside the span"),
        ([Leg(X, 2.0)], {"masses": [PointMass(1.0, -3.0)]}, "mass[0].mass", "mass of -3 kg"),
        (
            [Leg(X, 2.0)],
            {"supports": [Support(1.0, "rest", vertical=-1.0)]},
            "support[0].vertical",
            "stiffness of -1",
        ),
    ],
)
def test_contradictions_name_their_place(legs, extra, field, words):
    with pytest.raises(InputError, match=words) as raised:
        span_of(legs, **extra)
    assert raised.value.place.field == field
    assert raised.value.remedy
