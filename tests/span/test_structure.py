"""The assembled span: bends, derivatives, rows and invariance."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.span.factor import Factor
from fieldkit.span.layout import Insulation, Leg, Span, State, Support, axis_vectors
from fieldkit.span.materials import material
from fieldkit.span.modes import solve, span_matrices
from fieldkit.span.pipes import standard_pipe
from fieldkit.span.structure import (
    assemble,
    contents_mass,
    segments,
    stretch_derivative,
    wall_derivative,
)
from fieldkit.span.supports import springs
from tests.reference.spans import STATE, STEEL, anchored, square_legs
from tests.span.drawn import FULL, drawn_span, limit_hz

PIPE = standard_pipe("NPS 3", "40")
seeds = st.integers(0, 10_000)


def quarter_bend(pipe, radius: float) -> Span:
    """Nothing but a bend, from +x into +y."""
    legs = (Leg((1.0, 0.0, 0.0), radius), Leg((0.0, 1.0, 0.0), radius, radius))
    return Span(pipe, STEEL, legs, (anchored(0.0),))


def test_quarter_bend_by_castigliano():
    """Tip of a quarter circle loaded along both its tangents and out of its plane.

    The factor k on bending alone. With t = 3 pi/4 - 2, in plane: R^3 k/EI pi/4 along the first
    tangent and R^3 k/EI t along the last, each with pi R/4 (1/EA + 1/kGA); out of plane
    R^3 (pi/4 k/EI + t/GJ) + pi R/2/kGA (Castigliano, derived here).
    """
    span = quarter_bend(PIPE, 0.5)
    structure = assemble(span, STATE, up_to_hz=50.0)
    R, pipe, E, G = 0.5, span.pipe, 2e11, 2e11 / 2.6
    k = 1.65 * pipe.mean_radius_m**2 / (pipe.wall_m * R)
    EI, EA, GJ = E * pipe.second_moment_m4, E * pipe.wall_area_m2, 2 * G * pipe.second_moment_m4
    shear = structure.elements.shear_rigidity_n[0] / structure.elements.axial_rigidity_n[0] * EA
    flexibility = np.linalg.inv(structure.stiffness.toarray()[6:, 6:])[-6:, -6:]
    tail = 3 * math.pi / 4 - 2
    assert k > 1
    direct = math.pi * R / 4 * (1 / EA + 1 / shear)
    assert flexibility[0, 0] == pytest.approx(R**3 * k / EI * math.pi / 4 + direct, rel=2e-3)
    assert flexibility[1, 1] == pytest.approx(R**3 * k / EI * tail + direct, rel=2e-3)
    assert flexibility[2, 2] == pytest.approx(
        R**3 * (math.pi / 4 * k / EI + tail / GJ) + math.pi * R / 2 / shear, rel=2e-3
    )


@settings(max_examples=15, deadline=None)
@given(seeds, st.integers(0, 3))
def test_rigid_motion_of_the_whole_span_strains_nothing(seed, bends):
    """Six rigid motions, bends included; translation carries pipe, contents and no more."""
    span = drawn_span(seed, bends)
    structure = assemble(span, FULL, up_to_hz=limit_hz(span, 3))
    rigid = np.zeros((len(structure.station_m), 6, 6))
    for i, axis in enumerate(np.eye(3)):
        rigid[:, i, i] = 1.0
        rigid[:, :3, 3 + i] = np.cross(axis, structure.position_m)
        rigid[:, 3 + i, 3 + i] = 1.0
    rigid = rigid.reshape(-1, 6)
    scale = abs(structure.stiffness).max()
    assert np.abs(structure.stiffness @ rigid).max() < 1e-9 * scale * max(1.0, span.length_m)
    per_metre = 7850 * span.pipe.wall_area_m2 + 998 * span.pipe.bore_area_m2
    true_length = sum(piece.arc_length_m for piece in span.centre_line.pieces)
    inertia = rigid.T @ (structure.mass @ rigid)
    assert inertia[:3, :3] == pytest.approx(per_metre * true_length * np.eye(3), rel=1e-9, abs=1e-6)
    assert structure.element_length_m.sum() == pytest.approx(true_length)


@settings(max_examples=10, deadline=None)
@given(st.tuples(*[st.floats(-3, 3)] * 3), seeds)
def test_frequencies_do_not_depend_on_where_the_span_points(turn, seed):
    """A bent span anchored against everything, turned bodily in space."""
    from scipy.spatial.transform import Rotation

    base = drawn_span(seed, 2)
    lengths = [leg.length_m for leg in base.legs]
    legs = square_legs(lengths, ["+x", "+y", "+z"], 1.5 * base.pipe.outside_diameter_m)
    rotation = Rotation.from_rotvec(turn)

    def turned(leg: Leg) -> Leg:
        x, y, z = rotation.apply(leg.direction)
        return replace(leg, direction=(float(x), float(y), float(z)))

    ends = (anchored(0.0), anchored(sum(lengths)))
    up_to = limit_hz(base, 6)
    before, after = (
        lowest(Span(base.pipe, STEEL, each, ends), up_to)
        for each in (legs, tuple(turned(leg) for leg in legs))
    )
    assert after == pytest.approx(before, rel=1e-6)


def lowest(span: Span, up_to_hz: float) -> np.ndarray:
    structure = assemble(span, FULL, up_to_hz=up_to_hz)
    return solve(*span_matrices(structure, springs(span), span.masses), count=5)[0]


@settings(max_examples=10, deadline=None)
@given(seeds, st.integers(0, 2))
def test_reciprocity(seed, bends):
    """A force here moves there as a force there moves here, in whatever directions."""
    span = drawn_span(seed, bends)
    structure = assemble(span, FULL, up_to_hz=limit_hz(span, 3))
    stiffness, mass = span_matrices(structure, springs(span), span.masses)
    here = structure.motion_rows(0.37 * span.length_m, "vertical")
    there = structure.point_rows(0.71 * span.length_m, (0.1, 0.2, -0.1))
    solver = Factor((stiffness + 100.0 * mass).tocsc())
    one, other = here @ solver.solve(there.T), there @ solver.solve(here.T)
    assert one == pytest.approx(other.T, rel=1e-6, abs=1e-9 * np.abs(one).max())


@pytest.mark.parametrize("axis", ["vertical", "lateral", "axial", "rotation", "torsion", "y"])
def test_rows_of_a_rigid_motion(axis):
    """A slow turn of a bent span is read at any station as position times turn."""
    legs = square_legs([1.3, 0.9], ["+x", "+z"], 0.2)
    structure = assemble(Span(PIPE, STEEL, legs), STATE, up_to_hz=50.0)
    turn = np.array([0.3, -0.2, 0.5])
    nodal = np.zeros((len(structure.station_m), 6))
    nodal[:, :3] = np.cross(turn, structure.position_m)
    nodal[:, 3:] = turn
    centre_line = structure.span.centre_line
    for station in (0.0, 0.41, 1.0, 1.13, 1.3, 1.42, 2.2):
        place, tangent = centre_line.at(station)
        expected = turn if axis in ("rotation", "torsion") else np.cross(turn, place)
        rows = structure.motion_rows(station, axis)
        read = axis_vectors(tangent, axis) @ expected
        assert rows @ nodal.ravel() == pytest.approx(read, abs=1e-9)
    offset = (0.1, -0.3, 0.2)
    place = centre_line.at(0.41)[0] + offset
    rows = structure.point_rows(0.41, offset)
    assert rows @ nodal.ravel() == pytest.approx(np.cross(turn, place))


LENGTHS = [1.9, 1.2, 1.6]


def bent(lengths: list[float], clamp_at: float) -> Span:
    supports = (anchored(0.0), Support(clamp_at, "clamp"), anchored(sum(lengths)))
    legs = square_legs(lengths, ["+x", "+z", "+y"], 0.12)
    return Span(PIPE, STEEL, legs, supports, contents_density_kg_per_m3=900.0)


def test_segments_run_between_ends_supports_and_corners():
    found = np.array(segments(bent(LENGTHS, 0.7)))
    assert found == pytest.approx(np.array([(0, 0.7), (0.7, 1.9), (1.9, 3.1), (3.1, 4.7)]))


@pytest.mark.parametrize("segment", range(4))
def test_stretch_derivative_against_a_span_measured_longer(segment):
    """A leg re-measured 1e-4 longer or shorter between two marks, reassembled."""
    structure = assemble(bent(LENGTHS, 0.7), FULL, up_to_hz=200.0)
    start, end = segments(structure.span)[segment]
    step = 1e-4

    def measured(factor: float):
        lengths, clamp = list(LENGTHS), 0.7
        more = (factor - 1) * (end - start)
        lengths[max(segment - 1, 0)] += more
        clamp += more if segment == 0 else 0.0
        return assemble(bent(lengths, clamp), FULL, up_to_hz=200.0)

    up, down = measured(1 + step), measured(1 - step)
    for ours, high, low in zip(
        stretch_derivative(structure, start, end),
        (up.stiffness, up.mass),
        (down.stiffness, down.mass),
        strict=True,
    ):
        expected = (high - low) / (2 * step)
        assert abs(ours - expected).max() < 1e-5 * abs(expected).max()


def test_wall_derivative_against_a_thicker_pipe():
    """Outside diameter fixed: stiffness, steel, contents and elbow factor all follow the wall."""
    span = bent(LENGTHS, 0.7)
    structure = assemble(span, FULL, up_to_hz=200.0)
    step = 3e-4

    def with_wall(factor: float):
        pipe = replace(span.pipe, wall_m=span.pipe.wall_m * factor)
        return assemble(replace(span, pipe=pipe), FULL, up_to_hz=200.0)

    up, down = with_wall(1 + step), with_wall(1 - step)
    stiffness, mass = wall_derivative(structure)
    for ours, expected in (
        (stiffness, (up.stiffness - down.stiffness) / (2 * step)),
        (mass, (up.mass - down.mass) / (2 * step)),
    ):
        assert abs(ours - expected).max() < 1e-5 * abs(expected).max()


def test_contents_add_in_proportion_to_fill():
    """M(fill) = M(0) + fill x contents, to rounding."""
    span = bent(LENGTHS, 0.7)
    empty, third = (assemble(span, FULL, up_to_hz=200.0, fill=fill) for fill in (0.0, 1 / 3))
    grown = empty.mass + contents_mass(empty) / 3
    assert abs(grown - third.mass).max() < 1e-12 * abs(third.mass).max()


def test_insulation_adds_mass_and_no_stiffness():
    """50 mm at 130 kg/m^3 round the pipe."""
    bare = bent(LENGTHS, 0.7)
    lagged = replace(bare, insulation=Insulation(0.05, 130.0))
    plain, heavy = (assemble(span, STATE, up_to_hz=100.0) for span in (bare, lagged))
    outside = bare.pipe.outside_diameter_m
    layer = 130.0 * math.pi * ((outside / 2 + 0.05) ** 2 - (outside / 2) ** 2)
    shift = np.tile([1.0, 0, 0, 0, 0, 0], len(heavy.station_m))
    assert heavy.elements.mass_kg_per_m[0] - plain.elements.mass_kg_per_m[0] == pytest.approx(layer)
    assert shift @ (heavy.mass @ shift) == pytest.approx(
        (layer + 7850 * bare.pipe.wall_area_m2) * heavy.element_length_m.sum()
    )


def test_temperature_softens_the_pipe():
    """Carbon steel at 200 degC has 191.3/203.5 of the modulus at 20 degC (ASME B31.1-1995)."""
    span = replace(bent(LENGTHS, 0.7), material=material("carbon steel"))
    cold, hot = (
        assemble(span, State("s", temperature_k=k), up_to_hz=100.0, axial=False)
        for k in (294.26, 473.15)
    )
    ratio = hot.elements.axial_rigidity_n[0] / cold.elements.axial_rigidity_n[0]
    assert ratio == pytest.approx(191.3 / 203.4, rel=1e-3)
