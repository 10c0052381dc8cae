"""Modes of a span: laws they obey, their names, and the solver under them."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.errors import Refusal
from fieldkit.span import modes
from fieldkit.span.factor import Factor
from fieldkit.span.layout import Leg, PointMass, Span, Support
from fieldkit.span.modes import free_directions, solve, span_matrices, span_modes
from fieldkit.span.pipes import PipeSection
from fieldkit.span.structure import assemble
from fieldkit.span.supports import Spring, springs
from tests.reference.spans import STATE, STEEL, anchored, hold, level_span, square_legs, unit_hz
from tests.span.drawn import FULL, drawn_span, limit_hz

seeds = st.integers(0, 10_000)


def lowest(span: Span, count: int = 3) -> np.ndarray:
    return np.array([m.frequency_hz for m in span_modes(span, STATE, 60.0)[:count]])


@settings(max_examples=10, deadline=None)
@given(st.floats(0.5, 2.0))
def test_slender_spans_scale_as_theory_says(factor):
    """f goes with 1/L^2, with the root of E, and with one over the root of mass per length."""
    span = level_span(6.0, [anchored(0.0), anchored(6.0)])
    base = lowest(span)
    longer = level_span(6.0 * factor, [anchored(0.0), anchored(6.0 * factor)])
    stiffer = replace(STEEL, modulus_pa=((293.15, 2e11 * factor),))
    heavier = replace(STEEL, density_kg_per_m3=7850.0 * factor)
    assert lowest(longer) * factor**2 == pytest.approx(base, rel=2e-3)
    assert lowest(replace(span, material=stiffer)) == pytest.approx(base * factor**0.5, rel=5e-4)
    assert lowest(replace(span, material=heavier)) == pytest.approx(base / factor**0.5, rel=5e-4)


@settings(max_examples=12, deadline=None)
@given(seeds, st.integers(0, 2), st.floats(0.05, 0.95), st.floats(3, 9))
def test_a_spring_never_lowers_and_a_mass_never_raises_a_frequency(seed, bends, share, decade):
    """On one mesh, any direction, any station: Rayleigh's theorem of constraints."""
    span = drawn_span(seed, bends)
    at_m = share * span.length_m
    structure = assemble(span, FULL, up_to_hz=limit_hz(span, 5), extra_stations_m=(at_m,))
    held = springs(span)
    axis = ("vertical", "lateral", "axial", "rotation")[seed % 4]
    spring = Spring(0, at_m, axis, 10**decade, 0.0)
    mass = PointMass(at_m, 10 ** (decade - 5), offset_m=(0.1, 0.0, 0.2))
    before, stiffer, heavier = (
        solve(*span_matrices(structure, s, m), count=8)[0]
        for s, m in (
            (held, span.masses),
            ((*held, spring), span.masses),
            (held, (*span.masses, mass)),
        )
    )
    assert np.all(stiffer >= before * (1 - 1e-7))
    assert np.all(heavier <= before * (1 + 1e-7))


def test_equal_planes_come_as_one_vertical_and_one_lateral_mode():
    """A round pipe on equal supports moves in no plane of its own; the pairs are turned clean."""
    span = level_span(3.0, [anchored(0.0), anchored(3.0)])
    pairs = span_modes(span, STATE, 200.0)
    assert [mode.direction for mode in pairs[:4]] == ["vertical", "lateral"] * 2
    assert pairs[0].frequency_hz == pytest.approx(pairs[1].frequency_hz, rel=1e-6)
    assert np.abs(pairs[0].shape[:, 1]).max() < 1e-6
    assert np.abs(pairs[1].shape[:, 2]).max() < 1e-6


def test_equal_planes_of_a_pipe_aslant_are_turned_into_its_own_axes():
    """The same pipe pointing to (3, 4, 0): lateral is level and across it."""
    legs = (Leg((0.6, 0.8, 0.0), 3.0),)
    span = Span(level_span(3.0, []).pipe, STEEL, legs, (anchored(0.0), anchored(3.0)))
    vertical, lateral = span_modes(span, STATE, 200.0)[:2]
    middle = len(lateral.shape) // 2
    assert np.abs(lateral.shape[middle]) == pytest.approx([0.8, 0.6, 0.0], abs=1e-6)
    assert vertical.shape[middle] == pytest.approx([0.0, 0.0, 1.0], abs=1e-6)


def test_shape_station_and_largest_motion():
    """A pinned span bows as half a sine, most in the middle."""
    span = level_span(4.0, [hold(0.0), hold(4.0)])
    mode = span_modes(span, STATE, 50.0)[0]
    assert mode.where_m == pytest.approx(2.0, abs=0.15)
    assert mode.shape[:, 2] == pytest.approx(np.sin(np.pi * mode.station_m / 4.0), abs=6e-3)


def test_axial_mode_of_a_rod():
    """Held along itself at one end, free at the other: c/4L with c = sqrt(E/rho)."""
    supports = [hold(0.0), replace(hold(4.0), axial=0.0)]
    found = span_modes(level_span(4.0, supports), STATE, 500.0)
    axial = [mode for mode in found if mode.direction == "axial"]
    assert axial[0].frequency_hz == pytest.approx((2e11 / 7850) ** 0.5 / 16, rel=1e-3)
    assert axial[0].where_m == pytest.approx(4.0)


def test_a_riser_sways_laterally():
    """Both horizontals across a riser are lateral."""
    legs = (Leg((0.0, 0.0, 1.0), 3.0),)
    span = Span(level_span(3.0, []).pipe, STEEL, legs, (anchored(0.0), anchored(3.0)))
    assert {mode.direction for mode in span_modes(span, STATE, 100.0)} == {"lateral"}


def test_level_frame_moves_out_of_plane_first():
    """An L in a level plane: its first mode lifts the corner."""
    legs = square_legs([1.5, 1.5], ["+x", "+y"], 0.06)
    span = Span(level_span(3.0, []).pipe, STEEL, legs, (anchored(0.0), anchored(3.0)))
    first = span_modes(span, STATE, 100.0)[0]
    assert first.direction == "vertical"
    assert first.where_m == pytest.approx(1.5, abs=0.2)


def test_pure_twist_is_left_out():
    """GJ mode of a clamped pipe at c_s/2L: nothing on the centre line feels it."""
    span = level_span(4.0, [anchored(0.0), anchored(4.0)])
    twist_hz = (2e11 / 2.6 / 7850) ** 0.5 / 8
    plain = span_modes(span, STATE, 1.1 * twist_hz)
    structure = assemble(span, STATE, up_to_hz=1.1 * twist_hz)
    matrices = span_matrices(structure, springs(span), ())
    every, vectors = solve(*matrices, up_to_hz=1.1 * twist_hz)
    shares = modes.direction_shares(structure, (), vectors)
    silent = every[shares[:, 3] > modes.TWIST]
    assert silent == pytest.approx([twist_hz], rel=1e-3)
    assert len(plain) == len(every) - 1


def test_a_mass_that_stands_off_twists_the_pipe_as_it_sways():
    """Heavy mass M at height h in mid span: sway and twist in series, M (c + h^2 L/4GJ)."""
    span = level_span(4.0, [anchored(0.0), anchored(4.0)])
    shear_rigidity = 2 * 2e11 / 2.6 * span.pipe.second_moment_m4
    sways = []
    for height in (0.0, 0.3):
        masses = (PointMass(2.0, 400.0, offset_m=(0.0, 0.0, height)),)
        found = span_modes(replace(span, masses=masses), STATE, 5.0)
        sways.append(min(m.frequency_hz for m in found if m.direction == "lateral"))
    centred, offset = ((2 * np.pi * f) ** -2 for f in sways)
    assert offset - centred == pytest.approx(400.0 * 0.3**2 * 4.0 / (4 * shear_rigidity), rel=0.01)


def test_what_nothing_holds_is_left_out_and_named():
    """A pipe free to slide keeps its bending modes; the rigid slide at 0 Hz is no mode."""
    supports = [replace(hold(at), axial=0.0) for at in (0.0, 3.0)]
    span = level_span(3.0, supports)
    assert free_directions(span) == ("x",)
    assert free_directions(level_span(3.0, [anchored(0.0)])) == ()
    found = span_modes(span, STATE, 30.0)
    assert found[0].frequency_hz == pytest.approx(9.8696 * unit_hz(span, 3.0), rel=2e-3)


def test_a_free_pipe_has_only_its_elastic_modes():
    """Nothing holds it at all: clamped-clamped frequencies, 22.3733."""
    span = level_span(3.0, [])
    found = span_modes(span, STATE, 60.0)
    assert found[0].frequency_hz == pytest.approx(22.3733 * unit_hz(span, 3.0), rel=2e-3)


@pytest.mark.parametrize("seed", range(6))
def test_subspace_iteration_finds_what_a_dense_solver_finds(seed, monkeypatch):
    """Same frequencies one for one, equal pairs included, and mass-normalised vectors."""
    span = drawn_span(seed, seed % 3)
    if seed == 0:
        span = replace(span, supports=(anchored(0.0), anchored(span.length_m)), masses=())
    up_to = limit_hz(span, 6)
    structure = assemble(span, FULL, up_to_hz=up_to)
    stiffness, mass = span_matrices(structure, springs(span), span.masses)
    monkeypatch.setattr(modes, "DENSE_UP_TO", 0)
    swift, vectors = solve(stiffness, mass, up_to_hz=up_to)
    monkeypatch.setattr(modes, "DENSE_UP_TO", 10**6)
    dense, _ = solve(stiffness, mass, up_to_hz=up_to)
    assert swift == pytest.approx(dense, rel=1e-6)
    assert vectors.T @ (mass @ vectors) == pytest.approx(np.eye(len(swift)), abs=1e-6)
    first = solve(stiffness, mass, count=2)[0]
    assert first == pytest.approx(dense[:2], rel=1e-6)


def test_a_count_and_a_limit_end_at_the_earlier():
    span = level_span(6.0, [anchored(0.0), anchored(6.0)])
    structure = assemble(span, STATE, up_to_hz=60.0)
    matrices = span_matrices(structure, springs(span), ())
    every = solve(*matrices, up_to_hz=60.0)[0]
    assert len(solve(*matrices, up_to_hz=60.0, count=3)[0]) == 3
    assert len(solve(*matrices, up_to_hz=60.0, count=99)[0]) == len(every)
    assert len(solve(*matrices, up_to_hz=0.9 * every[0])[0]) == 0


def test_negative_stiffness_is_refused():
    span = level_span(3.0, [anchored(0.0), anchored(3.0)])
    structure = assemble(span, STATE, up_to_hz=60.0)
    push = [*springs(span), Spring(0, 1.5, "vertical", 1.0, 0.0)]
    stiffness, mass = span_matrices(structure, push, ())
    unstable = stiffness - 1e5 * (span_matrices(structure, push[-1:], ())[0] - structure.stiffness)
    with pytest.raises(Refusal, match="no stable equilibrium"):
        solve(unstable, mass, up_to_hz=60.0)


@settings(max_examples=20, deadline=None)
@given(seeds, st.floats(0.1, 2000.0))
def test_count_of_negatives_is_that_of_the_eigenvalues(seed, shift_hz):
    """Sylvester's law of inertia against a dense eigensolver, at any shift."""
    span = drawn_span(seed, seed % 2)
    structure = assemble(span, FULL, up_to_hz=limit_hz(span, 2))
    stiffness, mass = span_matrices(structure, springs(span), span.masses)
    shifted = (stiffness - (2 * np.pi * shift_hz) ** 2 * mass).tocsc()
    scale = 1 / np.sqrt(stiffness.diagonal())
    dense = np.linalg.eigvalsh(scale[:, None] * shifted.toarray() * scale)
    assert Factor(shifted).negatives == int(np.sum(dense < 0))


def test_count_of_negatives_survives_a_zero_on_the_diagonal():
    """[[0, 1], [1, 0]] needs a pivot; its eigenvalues are +1 and -1."""
    from scipy.sparse import csc_array

    assert Factor(csc_array(np.array([[0.0, 1.0], [1.0, 0.0]]))).negatives == 1


def test_supports_of_every_kind_give_modes():
    """The table of supports is sound on a level line and on a riser."""
    for direction in ((1.0, 0.0, 0.0), (0.0, 0.0, 1.0)):
        for kind in ("anchor", "nozzle", "clamp", "u-bolt", "guide", "rest", "hanger"):
            ends = (Support(0.0, kind), Support(3.0, "anchor"))
            span = Span(level_span(3.0, []).pipe, STEEL, (Leg(direction, 3.0),), ends)
            assert span_modes(span, STATE, 100.0)


def test_hundreds_of_modes_are_refused_before_they_are_solved_for():
    """A line of 127 m has too many below 200 Hz to be solved or looked at."""
    span = level_span(127.0, [anchored(0.0), anchored(4.2)], pipe=PipeSection(0.0889, 0.00549))
    with pytest.raises(Refusal, match=r"\d+ modes lie below 200 Hz on this span, more than 200"):
        span_modes(span, STATE, 200.0)
