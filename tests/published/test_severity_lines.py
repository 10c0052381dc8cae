"""Severity lines and velocity-stress factors against recomputed and quoted figures."""

from __future__ import annotations

import math

import numpy as np
import pytest

from fieldkit.detune import severity_lines as lines
from fieldkit.detune.velocity_stress import SHAPE_FACTOR, carried_mass_ratio, stress_per_velocity
from fieldkit.span.eigenvalues import single_span
from fieldkit.span.layout import Insulation, Leg, Span, State
from fieldkit.span.materials import Material
from fieldkit.span.pipes import PipeSection, standard_pipe

PSI, INCH = 6894.757293168, 0.0254
STEEL = Material("US steel", 0.283 * 0.45359237 / INCH**3, 0.3, ((293.0, 30e6 * PSI),), 12e-6)
"""30e6 psi and 0.283 lb/in^3, the figures of the US velocity-stress factors."""
EMPTY = State("running", fill=(0.0, 0.0))
PSI_PER_INCH_PER_S = PSI / INCH


def span_of(pipe: PipeSection, **more: object) -> Span:
    return Span(pipe, STEEL, (Leg((1.0, 0.0, 0.0), 3.0),), **more)


@pytest.mark.parametrize(
    ("size", "ends", "psi_per_inch_per_s"),
    [
        # beam theory with 30e6 psi, 0.283 lb/in^3: sqrt(E rho) = 148.29 psi/(in/s)
        ("2", "pinned-pinned", 223.7),
        ("4", "pinned-pinned", 221.0),
        ("6", "pinned-pinned", 218.8),
        ("10", "pinned-pinned", 216.9),
        ("2", "fixed-pinned", 296.5),
        ("4", "fixed-pinned", 292.9),
        ("6", "fixed-pinned", 289.9),
        ("10", "fixed-pinned", 287.5),
        ("2", "fixed-fixed", 281.7),
        ("4", "fixed-fixed", 278.4),
        ("6", "fixed-fixed", 275.5),
        ("10", "fixed-fixed", 273.2),
        ("6", "cantilever", 218.8),
    ],
)
def test_velocity_stress_of_empty_schedule_40(size, ends, psi_per_inch_per_s):
    """Recomputed by hand from sigma/v = c sqrt(E rho) (D/2)/r_g.

    Wachel's 219, 219, 290 and 275 (1990, from memory) are those of NPS 6.
    """
    found = stress_per_velocity(
        span_of(standard_pipe(f"NPS {size}", "40")), EMPTY, SHAPE_FACTOR[ends]
    )
    assert found / PSI_PER_INCH_PER_S == pytest.approx(psi_per_inch_per_s, rel=1e-3)


@pytest.mark.parametrize(("wall_share", "expected"), [(1e-4, 209.7), (0.499999, 296.6)])
def test_velocity_stress_of_thin_pipe_and_solid_bar(wall_share, expected):
    """(D/2)/r_g is sqrt 2 for a thin pipe and 2 for a solid bar."""
    pipe = PipeSection(0.2, wall_share * 0.2)
    found = stress_per_velocity(span_of(pipe), EMPTY, 1.0)
    assert found / PSI_PER_INCH_PER_S == pytest.approx(expected, rel=1e-3)


@pytest.mark.parametrize(
    ("name", "ends"),
    [
        ("cantilever", "clamped-free"),
        ("fixed-pinned", "clamped-pinned"),
        ("fixed-fixed", "clamped-clamped"),
    ],
)
def test_shape_factors_follow_from_the_closed_form_shapes(name, ends):
    """max|phi''| / (b^2 max|phi|) of cosh - cos - s (sinh - sin), which all three share."""
    b = single_span(ends, 1)[0]
    x = np.linspace(0.0, b, 200_001)
    s = (
        (np.cosh(b) + np.cos(b)) / (np.sinh(b) + np.sin(b))
        if name == "cantilever"
        else (np.cosh(b) - np.cos(b)) / (np.sinh(b) - np.sin(b))
    )
    shape = np.cosh(x) - np.cos(x) - s * (np.sinh(x) - np.sin(x))
    curvature = np.cosh(x) + np.cos(x) - s * (np.sinh(x) + np.sin(x))
    assert np.abs(curvature).max() / np.abs(shape).max() == pytest.approx(
        SHAPE_FACTOR[name], rel=2e-5
    )


def test_contents_and_insulation_raise_the_stress_by_the_root_of_the_mass():
    """Water in NPS 4 schedule 40 and 50 mm of wool, weights worked out by hand per metre."""
    pipe = standard_pipe("NPS 4", "40")
    full = span_of(pipe, contents_density_kg_per_m3=1000.0, insulation=Insulation(0.05, 128.0))
    steel = STEEL.density_kg_per_m3 * math.pi / 4 * (0.1143**2 - 0.10226**2)
    water = 1000.0 * math.pi / 4 * 0.10226**2
    wool = 128.0 * math.pi / 4 * (0.2143**2 - 0.1143**2)
    ratio = (steel + water + wool) / steel
    assert carried_mass_ratio(full, State("running")) == pytest.approx(ratio, rel=1e-4)
    raised = stress_per_velocity(full, State("running")) / stress_per_velocity(full, EMPTY)
    assert raised**2 == pytest.approx(ratio / ((steel + wool) / steel), rel=1e-4)


def test_the_om3_defaults_give_half_an_inch_a_second():
    """0.15 x 0.7 / 1.5 x 3.64e-3 x 7690 / 4 = 0.490 in/s: the usual 0.5 in/s (from memory)."""
    assert lines.om3_velocity(lines.OM3_C3**2) / INCH == pytest.approx(0.490, abs=5e-4)
    assert lines.om3_velocity(lines.OM3_C3**2) == pytest.approx(12.7e-3, rel=0.025)
    beta = lines.OM3_BETA
    assert 1e6 * beta == pytest.approx(13.4e-3, rel=2e-3)


def test_the_om3_velocity_falls_where_the_force_stays_below_the_first_mode():
    """C5 divides it."""
    assert lines.om3_velocity(1.0, 2.0) == pytest.approx(0.5 * lines.om3_velocity(1.0))


def test_one_over_beta_is_the_fixed_fixed_factor_of_nps_6():
    """274.7 psi/(in/s) against 275.5 computed: the two criteria share their physics."""
    fixed = stress_per_velocity(
        span_of(standard_pipe("NPS 6", "40")), EMPTY, SHAPE_FACTOR["fixed-fixed"]
    )
    assert fixed * lines.OM3_BETA == pytest.approx(1.0, rel=5e-3)


@pytest.mark.parametrize(
    ("hz", "concern", "problem"),
    [
        (1, 1.68, 7.90), (5, 3.58, 17.10), (10, 4.96, 23.84), (20, 6.87, 33.25), (30, 8.32, 40.38),
        (50, 10.57, 51.60), (100, 14.65, 71.95), (200, 20.29, 100.3), (300, 24.54, 121.9),
    ],
)  # fmt: skip
def test_the_guideline_lines(hz, concern, problem):
    """mm/s rms worked out from the four constants of the guideline (constants from memory)."""
    assert 1e3 * lines.concern_m_per_s(hz) == pytest.approx(concern, abs=0.006)
    assert 1e3 * lines.problem_m_per_s(hz) == pytest.approx(problem, rel=1e-3)


def test_the_iso_zones_agree_with_their_displacement_and_acceleration():
    """0.202/0.302/0.454 mm at 10 Hz, 16.0/23.9/35.8 m/s^2 at 200 Hz: ISO 20816-8 (from memory)."""
    zones = np.array(list(lines.ISO_ZONES_M_PER_S.values()))
    assert np.array([0.202, 0.302, 0.454]) * 1e-3 * 2 * np.pi * 10 == pytest.approx(zones, rel=2e-3)
    assert zones * 2 * np.pi * 200 == pytest.approx([16.0, 23.9, 35.8], rel=4e-3)


@pytest.mark.parametrize(
    ("rms_mm_per_s", "zone"), [(5, "A"), (12.7, "A"), (13, "B"), (20, "C"), (28.6, "D")]
)
def test_the_iso_zone_letters(rms_mm_per_s, zone):
    """A up to 12.7, B up to 19, C up to 28.5 mm/s rms, D above."""
    assert lines.iso_zone(1e-3 * rms_mm_per_s) == zone


def test_the_two_branches_of_the_api_618_line_meet():
    """0.508 mm (20 mil) peak to peak at 10 Hz is 31.9 mm/s: both ends are peak to peak."""
    assert 2 * np.pi * 10 * 20 * INCH / 1000 == pytest.approx(31.9e-3, rel=1e-3)
    assert lines.api618_velocity(9.999) == pytest.approx(lines.api618_velocity(10.0), rel=0.02)
    assert lines.api618_velocity(5.0) == pytest.approx(2 * np.pi * 5 * 0.5e-3)
