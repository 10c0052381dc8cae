"""The handbook estimate: which formula it picks, what it says, and whether its bracket holds."""

import math
import random
import re
from dataclasses import replace

import numpy as np
import pytest

from fieldkit.errors import Refusal
from fieldkit.span import eigenvalues
from fieldkit.span.handbook import estimate
from fieldkit.span.layout import Insulation, Leg, PointMass, Span, State, Support
from fieldkit.span.materials import Material
from fieldkit.span.modes import span_modes
from fieldkit.span.pipes import PipeSection
from tests.reference.dynamic_stiffness import Attachment, Beam, natural_frequencies_hz
from tests.reference.spans import (
    SLENDER,
    STATE,
    STEEL,
    frequencies_hz,
    hold,
    level_span,
    square_legs,
    unit_hz,
)

NPS4 = PipeSection(0.1143, 0.00602, "NPS 4 schedule 40")
FIELD_STEEL = Material("field steel", 7850.0, 0.3, ((293.15, 203.0e9),), 0.0)
FULL = State("running", fill=(1.0, 1.0))


def kinds(*supports, length=6.0, masses=(), pipe=SLENDER):
    return level_span(length, [Support(at, kind) for at, kind in supports], masses, pipe)


def exact_hz(length, stations, ends, masses):
    beam = Beam(2e11 * SLENDER.second_moment_m4, 7850 * SLENDER.wall_area_m2)
    attached = [Attachment(m.at_m, mass_kg=m.mass_kg) for m in masses]
    for at, end in zip(stations, ends, strict=True):
        attached.append(Attachment(at, math.inf, math.inf if end == "clamped" else 0.0))
    return natural_frequencies_hz(beam, length, attached, 1)[0]


def test_field_arithmetic():
    """NPS 4 Sch 40 by hand: EI 203 GPa x 3.01052e-6 m^4, 24.2885 kg/m full, 4 m."""
    span = replace(
        kinds((0, "guide"), (4, "guide"), length=4.0, pipe=NPS4),
        material=FIELD_STEEL,
        contents_density_kg_per_m3=1000.0,
    )
    found = estimate(span, FULL)
    assert (found.low_hz, found.frequency_hz) == pytest.approx((15.573, 15.573), rel=0.02)
    assert found.frequency_hz == pytest.approx(15.573, rel=1e-4)
    assert found.high_hz == pytest.approx(35.302, rel=1e-4)
    assert estimate(span, STATE).frequency_hz == pytest.approx(19.142, rel=1e-4)


def test_field_arithmetic_of_a_stub():
    """NPS 2 Sch 80 stub of 0.5 m, water filled, by hand: 197.77 Hz fixed."""
    pipe = PipeSection(0.0603, 0.00554)
    span = replace(
        kinds((0, "nozzle"), length=0.5, pipe=pipe),
        material=FIELD_STEEL,
        contents_density_kg_per_m3=1000.0,
    )
    assert estimate(span, FULL).frequency_hz == pytest.approx(197.77, rel=1e-4)


@pytest.mark.parametrize(
    ("left", "right", "squared"),
    [
        ("anchor", "nozzle", 22.3733),
        ("guide", "rest", 9.8696),
        ("anchor", "u-bolt", 15.4182),
        ("clamp", "clamp", 3.9312**2),
        ("hanger", "anchor", 15.4182),
    ],
)
def test_ends_by_kind(left, right, squared):
    """Anchors and nozzles are fixed, clamps half way, the others pinned."""
    span = kinds((0, left), (6, right))
    found = estimate(span, STATE)
    assert found.frequency_hz / unit_hz(span, 6.0) == pytest.approx(squared, rel=1e-4)
    assert found.low_hz / unit_hz(span, 6.0) == pytest.approx(9.8696, rel=2e-4)
    assert found.high_hz / unit_hz(span, 6.0) == pytest.approx(22.3733, rel=1e-5)
    assert "Thomson" in found.source


@pytest.mark.parametrize("ratio", [0.1, 0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 100.0])
def test_stated_rotation_is_used(ratio):
    """k_r L/EI at both ends, against the exact root: within 2.2 %."""
    exact = eigenvalues.pinned_with_rotational_springs(ratio, 1)[0] ** 2
    k = ratio * 2e11 * SLENDER.second_moment_m4 / 6.0
    span = level_span(6.0, [Support(at, "guide", rotation=k) for at in (0.0, 6.0)])
    found = estimate(span, STATE).frequency_hz / unit_hz(span, 6.0)
    assert found == pytest.approx(exact, rel=0.022)


def test_contents_insulation_and_heat_enter():
    """Mass per metre with water and a layer, modulus of the hot wall."""
    soft = Material("soft when hot", 7850.0, 0.3, ((293.15, 203e9), (473.15, 150e9)), 0.0)
    span = replace(
        kinds((0, "anchor"), (4, "anchor"), length=4.0, pipe=NPS4),
        material=soft,
        contents_density_kg_per_m3=1000.0,
        insulation=Insulation(0.05, 130.0),
    )
    hot = State("running", fill=(0.4, 0.6), temperature_k=473.15)
    layer = 130 * math.pi * ((0.1143 / 2 + 0.05) ** 2 - (0.1143 / 2) ** 2)
    mass = 7850 * NPS4.wall_area_m2 + 500 * NPS4.bore_area_m2 + layer
    expected = 22.3733 / (2 * math.pi * 16) * math.sqrt(150e9 * NPS4.second_moment_m4 / mass)
    found = estimate(span, hot)
    assert found.frequency_hz == pytest.approx(expected, rel=1e-5)
    assert "axial force" in found.note


def test_mass_in_the_middle_is_exact():
    """mu = 1 between pinned ends: lambda^2 = 5.6795979; fixed: 11.818212."""
    mass = PointMass(3.0, 7850 * SLENDER.wall_area_m2 * 6.0, "valve")
    span = kinds((0, "guide"), (6, "guide"), masses=(mass,))
    found = estimate(span, STATE)
    assert found.frequency_hz / unit_hz(span, 6.0) == pytest.approx(5.6795979, rel=1e-7)
    assert found.high_hz / unit_hz(span, 6.0) == pytest.approx(11.818212, rel=1e-7)
    assert "tan l - tanh l" in found.formula
    assert "at 3.00 m" in found.formula


def test_mass_elsewhere_by_rayleigh():
    """A valve at a third: the formula is named and the figure is close."""
    mass = PointMass(2.0, 4.0, "valve")
    found = estimate(kinds((0, "guide"), (6, "anchor"), masses=(mass,)), STATE)
    exact = exact_hz(6.0, (0, 6), ("pinned", "clamped"), (mass,))
    assert found.frequency_hz == pytest.approx(exact, rel=0.01)
    assert "Rayleigh" in found.source


def test_cantilever_with_tip_mass():
    """A small-bore branch with a valve: mu = 1, lambda^2 = 1.5572979; bracket from 0.6 of it."""
    mass = PointMass(0.5, 7850 * SLENDER.wall_area_m2 * 0.5, "valve")
    span = kinds((0, "nozzle"), length=0.5, masses=(mass,))
    found = estimate(span, STATE)
    assert found.frequency_hz / unit_hz(span, 0.5) == pytest.approx(1.5572979, rel=1e-7)
    assert found.high_hz == found.frequency_hz
    assert found.low_hz == pytest.approx(0.6 * found.frequency_hz, rel=0.02)
    assert "1568019" in found.source
    assert "0.6 of fixed" in found.note


def test_cantilever_from_the_other_end():
    """Free at the start, fixed at the end: the same branch walked the other way."""
    mass = PointMass(0.1, 1.0, "valve")
    there = kinds((0, "anchor"), length=0.5, masses=(replace(mass, at_m=0.4),))
    back = kinds((0.5, "anchor"), length=0.5, masses=(mass,))
    assert estimate(there, STATE).frequency_hz == pytest.approx(estimate(back, STATE).frequency_hz)


@pytest.mark.parametrize("ratio", [0.5, 2.0, 10.0])
def test_cantilever_on_a_soft_root(ratio):
    """Stated rotational stiffness of the header, against the exact root spring: within 1 %."""
    k = ratio * 2e11 * SLENDER.second_moment_m4 / 2.0
    span = level_span(2.0, [Support(0.0, "nozzle", rotation=k)])
    exact = eigenvalues.cantilever_on_root_spring(ratio, 1)[0] ** 2
    found = estimate(span, STATE)
    assert found.frequency_hz / unit_hz(span, 2.0) == pytest.approx(exact, rel=0.01)
    assert found.low_hz <= found.frequency_hz <= found.high_hz


def test_equal_spans():
    """Three spans on guides between anchors: lambda 3.5564085, Blevins named from memory."""
    span = kinds((0, "anchor"), (6, "guide"), (12, "u-bolt"), (18, "anchor"), length=18.0)
    found = estimate(span, STATE)
    assert found.frequency_hz / unit_hz(span, 6.0) == pytest.approx(3.5564085**2, rel=1e-7)
    assert "3 equal spans" in found.formula
    assert "from memory" in found.source


def test_nearly_equal_spans_stay_in_their_bracket():
    """8 % of difference still counts as equal."""
    span = kinds((0, "guide"), (6, "rest"), (12.4, "guide"), length=12.4)
    found = estimate(span, STATE)
    exact = exact_hz(12.4, (0, 6, 12.4), ("pinned",) * 3, ())
    assert "2 equal spans" in found.formula
    assert found.low_hz <= exact <= found.high_hz
    assert found.frequency_hz == pytest.approx(exact, rel=0.05)


def test_an_anchor_between_parts_the_spans():
    """Each side is a span of its own, the longer governs."""
    span = kinds((0, "guide"), (5, "anchor"), (8, "guide"), length=8.0)
    found = estimate(span, STATE)
    assert found.frequency_hz / unit_hz(span, 5.0) == pytest.approx(15.4182, rel=1e-4)
    assert "from 0.00 to 5.00 m" in found.note


def random_span(rng, overhangs, valves):
    count = rng.randint(1, 4)
    lengths = [rng.uniform(1.5, 6.0) for _ in range(count)]
    before, after = (rng.uniform(0.3, 2.0) if overhangs else 0.0 for _ in range(2))
    stations = np.cumsum([before, *lengths])
    length = float(stations[-1] + after)
    inner = ["pinned"] * (count - 1)
    ends = [rng.choice(["pinned", "clamped"]), *inner, rng.choice(["pinned", "clamped"])]
    masses = tuple(PointMass(rng.uniform(0, length), rng.uniform(0.2, 4.0)) for _ in range(valves))
    span = level_span(
        length, [hold(float(s), e) for s, e in zip(stations, ends, strict=True)], masses
    )
    return span, exact_hz(length, stations, ends, masses)


@pytest.mark.parametrize(
    ("overhangs", "valves", "median", "nine_of_ten"),
    [(False, 0, 0.03, 0.08), (False, 2, 0.03, 0.13), (True, 0, 0.04, 0.2), (True, 1, 0.04, 0.2)],
)
def test_random_spans(overhangs, valves, median, nine_of_ten):
    """Two dozen unequal spans of each sort against exact modes: bracket, and error as stated."""
    rng = random.Random(7)
    errors = []
    for _ in range(24):
        span, exact = random_span(rng, overhangs, valves)
        found = estimate(span, STATE)
        assert found.low_hz <= found.frequency_hz <= found.high_hz
        assert found.low_hz <= 1.005 * exact
        assert found.high_hz >= 0.995 * exact
        errors.append(abs(found.frequency_hz / exact - 1))
    assert np.median(errors) < median
    assert np.quantile(errors, 0.9) < nine_of_ten


BENT = [
    # directions, legs in m: fixed ends; factor from the published table (from memory)
    (["+x", "+y"], [3.0, 3.0], 16.5),
    (["+x", "+y", "-x"], [2.0, 2.0, 2.0], 18.7),
    (["+x", "+y", "+x"], [2.0, 2.0, 2.0], 22.4),
    (["+x", "+y", "+z"], [2.0, 2.0, 2.0], 20.6),
]


@pytest.mark.parametrize(("directions", "lengths", "factor"), BENT)
def test_bent_spans_of_equal_legs(directions, lengths, factor):
    """L, U, Z and 3-D between anchors: the published factor, and the span model within 6 %."""
    pipe = PipeSection(0.1683, 0.00711, "NPS 6 schedule 40")
    legs = square_legs(lengths, directions, 0.2286)
    held = tuple(Support(s, "anchor", *[math.inf] * 4) for s in (0.0, 6.0))
    span = Span(pipe, STEEL, legs, held)
    found = estimate(span, STATE)
    assert found.frequency_hz / unit_hz(span, 6.0) == pytest.approx(factor)
    assert "Wachel" in found.source
    modes = span_modes(span, STATE, 100.0)
    assert modes[0].frequency_hz == pytest.approx(found.frequency_hz, rel=0.06)


@pytest.mark.parametrize("legs", [[1.0, 4.0], [1.0, 3.0, 1.2], [2.5, 1.0, 2.5]])
def test_bent_spans_of_other_legs(legs):
    """Unequal legs by the computed table: the span model within 10 %, inside the bracket."""
    pipe = PipeSection(0.1143, 0.00602)
    held = tuple(Support(s, "anchor", *[math.inf] * 4) for s in (0.0, sum(legs)))
    span = Span(pipe, STEEL, square_legs(legs, ["+x", "+z", "+x"][: len(legs)], 0.152), held)
    found = estimate(span, STATE)
    lowest = span_modes(span, STATE, 100.0)[0].frequency_hz
    assert "computed" in found.source
    assert found.frequency_hz == pytest.approx(lowest, rel=0.1)
    assert found.low_hz < lowest < 1.1 * found.high_hz


def test_riser_between_clamps_and_level_run():
    """A gap with one bend beside straight ones: each by its own formula, the lowest governs."""
    legs = square_legs([4.0, 5.0], ["+x", "+z"], 0.152)
    supports = [(0.0, "anchor"), (2.0, "clamp"), (6.0, "clamp"), (9.0, "anchor")]
    span = Span(NPS4, STEEL, legs, tuple(Support(at, kind) for at, kind in supports))
    found = estimate(span, STATE)
    assert "L span" in found.formula
    assert "from 2.00 to 6.00 m" in found.note
    assert found.low_hz < found.frequency_hz < found.high_hz


@pytest.mark.parametrize(
    ("directions", "lengths", "masses", "reason"),
    [
        (["+x", "+y"], [3.0, 3.0], (PointMass(1.0, 30.0),), "carries 30 kg"),
        (["+x", "+y", "-x"], [4.0, 1.0, 4.0], (), "4.0 times its middle leg"),
        (["+x", "+y", "-x"], [3.0, 1.0, 1.0], (), "differ by a factor of 3.0"),
        (["+x", "+y", "+x", "+z"], [1.0, 1.0, 1.0, 1.0], (), "3 bends"),
    ],
)
def test_bent_spans_without_formula(directions, lengths, masses, reason):
    """Says which, and leaves it to the computed modes."""
    legs = square_legs(lengths, directions, 0.1)
    ends = (Support(0.0, "anchor"), Support(sum(lengths), "anchor"))
    with pytest.raises(Refusal, match=reason):
        estimate(Span(NPS4, STEEL, legs, ends, masses), STATE)


@pytest.mark.parametrize(
    ("kind", "at", "reason"),
    [("guide", 6.0, "slide along itself"), ("hanger", 2.0, "slide|sideways")],
)
def test_bent_gap_needs_ends_held_all_round(kind, at, reason):
    """A guide on the riser lets the pipe slide: the factors of fixed ends would be too high."""
    legs = square_legs([4.0, 5.0], ["+x", "+z"], 0.152)
    supports = (Support(0.0, "anchor"), Support(at, kind), Support(9.0, "anchor"))
    with pytest.raises(Refusal, match=reason):
        estimate(Span(NPS4, STEEL, legs, supports), STATE)


def test_rests_hold_little_sideways():
    """The estimate is for up and down, and says that sideways may be lower."""
    note = estimate(kinds((0, "rest"), (3, "rest"), (6, "rest"), pipe=NPS4), STATE).note
    assert "sideways modes may be lower" in note
    assert "rest at 3.00 m" in note


def test_odd_angle_has_no_formula():
    """A 45 degree bend is in no table."""
    half = math.sqrt(0.5)
    legs = (Leg((1.0, 0.0, 0.0), 3.0), Leg((half, half, 0.0), 3.0, 0.15))
    ends = (Support(0.0, "anchor"), Support(6.0, "anchor"))
    with pytest.raises(Refusal, match="another angle"):
        estimate(Span(NPS4, STEEL, legs, ends), STATE)


def test_slight_slope_counts_as_straight():
    """A change of 6 degrees, as in a line laid to fall."""
    fall = math.radians(6)
    legs = (Leg((1.0, 0.0, 0.0), 3.0), Leg((math.cos(fall), 0.0, -math.sin(fall)), 3.0, 0.15))
    ends = (Support(0.0, "anchor"), Support(6.0, "anchor"))
    span = Span(SLENDER, STEEL, legs, ends)
    assert estimate(span, STATE).frequency_hz / unit_hz(span, 6.0) == pytest.approx(
        22.3733, rel=1e-5
    )


def test_bent_overhang_has_no_formula():
    """A branch with an elbow before its valve."""
    legs = square_legs([0.5, 0.3], ["+z", "+x"], 0.05)
    with pytest.raises(Refusal, match="bent overhang"):
        estimate(Span(SLENDER, STEEL, legs, (Support(0.0, "nozzle"),)), STATE)


def test_nothing_holds_or_it_swings():
    """No support across, or one guide only: refused with what to enter."""
    with pytest.raises(Refusal, match="no support holds"):
        estimate(kinds((0, "free")), STATE)
    with pytest.raises(Refusal, match="swings"):
        estimate(kinds((1.0, "guide")), STATE)


def test_a_rest_does_not_hold_a_riser():
    """On a vertical leg it carries weight and lets the pipe sway."""
    legs = (Leg((0.0, 0.0, 1.0), 6.0),)
    supports = (Support(0.0, "anchor"), Support(3.0, "rest"), Support(6.0, "guide"))
    span = Span(SLENDER, STEEL, legs, supports)
    found = estimate(span, STATE).frequency_hz / unit_hz(span, 6.0)
    assert found == pytest.approx(15.4182, rel=1e-4)


def test_soft_support_short_span_and_offset_are_said():
    """Everything a reader must know to distrust the figure."""
    soft = Support(2.0, "free", vertical=1e5)
    mass = PointMass(1.0, 10.0, offset_m=(0.0, 0.0, 0.3))
    span = level_span(2.0, [Support(0.0, "anchor"), soft], (mass,), NPS4)
    note = estimate(span, STATE).note
    assert "less than twice as stiff as the span, so lower in truth: support at 2.00 m" in note
    assert "shear lowers it" in note
    assert "offset" in note


def test_formula_can_be_followed_by_hand():
    """Recompute the frequency from nothing but the printed figures."""
    found = estimate(kinds((0, "anchor"), (4, "guide"), length=4.0, pipe=NPS4), STATE)
    b, length, stiffness, mass = (
        float(re.search(rf"{name} = ([\d.]+)", found.formula)[1]) for name in ("b", "L", "EI", "m")
    )
    by_hand = b**2 / (2 * math.pi * length**2) * math.sqrt(stiffness * 1e3 / mass)
    assert by_hand == pytest.approx(found.frequency_hz, rel=1e-3)


def test_model_agrees_where_the_supports_are_rigid():
    """A two-span line with a valve: estimate and span model side by side, within 5 %."""
    mass = PointMass(2.4, 6.0, "valve")
    span = level_span(9.0, [hold(0.0, "clamped"), hold(5.0), hold(9.0)], (mass,))
    model = frequencies_hz(span_modes(span, STATE, 10.0), "vertical", 1)[0]
    assert estimate(span, STATE).frequency_hz == pytest.approx(model, rel=0.05)
