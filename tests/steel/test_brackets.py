"""Brackets against closed forms of beams, trusses and portal frames."""

import numpy as np
import pytest

from fieldkit.steel.brackets import (
    BASE_N_PER_M,
    FORMS,
    LENGTHS_M,
    MODULUS_PA,
    SHEAR_MODULUS_PA,
    bracket_stiffness,
    brackets,
    clamp_n_per_m,
)
from fieldkit.steel.frames import Base, Member, compliance
from fieldkit.steel.sections import sections

RIGID = 1e15
FORM = {form.name: form for form in FORMS}
SECTION = {section.name: section for section in sections()}
E_I, E_A, G_A = 5e5, 4e8, 1e8


def one(value):
    return np.array([float(value)])


def frame(points, joined, bases, node, *, shear=G_A, axial=E_A, turning=RIGID):
    members = tuple(Member(a, b, one(axial), one(ei), one(shear)) for a, b, ei in joined)
    held = tuple(Base(n, one(RIGID), one(turning)) for n in bases)
    return compliance(np.array([points], dtype=float), members, held, node)[0]


def test_cantilever_bends_by_l3_over_3ei_and_shears_by_l_over_ga():
    """Beam tables; the frame's x is along the arm."""
    length = 0.7
    along, across = frame([(0, 0), (length, 0)], [(0, 1, E_I)], [0], 1)
    assert across == pytest.approx(length**3 / (3 * E_I) + length / G_A, rel=1e-6)
    assert along == pytest.approx(length / E_A, rel=1e-6)


def test_knee_brace_is_a_two_bar_truss():
    """Virtual work, brace at 45 degrees: (1 + 2 sqrt 2) L / EA down; along the arm L / EA."""
    length = 0.8
    points = [(0, 0), (length, 0), (0, -length)]
    along, down = frame(points, [(0, 1, 1e-6), (2, 1, 1e-6)], [0, 2], 1)
    assert down == pytest.approx((1 + 2 * 2**0.5) * length / E_A, rel=1e-4)
    assert along == pytest.approx(length / E_A, rel=1e-4)


@pytest.mark.parametrize("beam_share", [0.05, 1.0, 40.0])
def test_portal_on_fixed_bases(beam_share):
    """Frame tables (Kleinlogel, from memory), g = (I beam / w) / (I post / h): sway stiffness
    (24 EI/h^3)(6 g + 1)/(6 g + 4); sag at mid beam w^3/48EI - (w^2/8EI)(w/8)(2/(2 + g))."""
    h, w = 0.9, 0.5
    beam = beam_share * E_I
    g = (beam / w) / (E_I / h)
    points = [(0, 0), (0, h), (w / 2, h), (w, h), (w, 0)]
    joined = [(0, 1, E_I), (1, 2, beam), (2, 3, beam), (3, 4, E_I)]
    sway, sag = frame(points, joined, [0, 4], 2, shear=1e14, axial=1e13)
    assert 1 / sway == pytest.approx(24 * E_I / h**3 * (6 * g + 1) / (6 * g + 4), rel=1e-4)
    bent = w**3 / (48 * beam) - w**2 / (8 * beam) * (w / 8) * 2 / (2 + g)
    assert sag == pytest.approx(bent, rel=1e-4)


def test_portal_limits_are_12ei_over_h3_and_3ei_over_h3_a_post():
    """A rigid beam keeps the post heads from turning, a limp one does not."""
    h, w = 1.0, 0.4
    points = [(0, 0), (0, h), (w / 2, h), (w, h), (w, 0)]
    for beam, each in ((1e4 * E_I, 12), (1e-6 * E_I, 3)):
        joined = [(0, 1, E_I), (1, 2, beam), (2, 3, beam), (3, 4, E_I)]
        sway, _ = frame(points, joined, [0, 4], 2, shear=1e14, axial=1e13)
        assert 1 / sway == pytest.approx(2 * each * E_I / h**3, rel=2e-3)


def test_clamp_arm_and_base_are_in_series():
    """Compliances add: clamp, base moving, base turning times L^2, arm."""
    section, length, pipe = SECTION["UPN 100"], 0.6, 0.1143
    vertical, lateral = bracket_stiffness(FORM["cantilever"], section, one(length), pipe)[0]
    turning = BASE_N_PER_M * section.depth_m**2
    arm = length**3 / (3 * MODULUS_PA * section.bending_m4)
    arm += length / (SHEAR_MODULUS_PA * section.shear_m2)
    give = 1 / clamp_n_per_m(pipe) + 1 / BASE_N_PER_M + length**2 / turning + arm
    assert 1 / vertical == pytest.approx(give)
    stretch = length / (MODULUS_PA * section.area_m2)
    assert 1 / lateral == pytest.approx(1 / clamp_n_per_m(pipe) + 1 / BASE_N_PER_M + stretch)


@pytest.mark.parametrize("form", FORMS, ids=lambda form: form.name)
def test_every_form_softens_with_length(form):
    """What the search for the longest length rests on; a portal's beam within 0.4 % a step."""
    for section in sections():
        stiffness = bracket_stiffness(form, section, LENGTHS_M, 0.1143)
        assert np.all(np.diff(stiffness, axis=0) < 4e-3 * stiffness[1:])
        assert np.all(stiffness[-1] < stiffness[0])


@pytest.mark.parametrize("needed", [(4e6, 4e6), (16e6, 0.0), (0.0, 2e6)])
def test_at_its_longest_a_bracket_is_just_stiff_enough(needed):
    """Either the stiffness, or the slenderness, or the end of the table stops it."""
    for found in brackets(*needed, 0.1143):
        section = SECTION[found.section]
        at = bracket_stiffness(FORM[found.form], section, one(found.longest_m), 0.1143)[0]
        share = min(k / n for k, n in zip(at, needed, strict=True) if n)
        slender = found.longest_m / section.least_radius_m > 149 or found.longest_m > 3.99
        assert share == pytest.approx(1.0, rel=2e-3) or (slender and share > 1)


def test_lighter_sections_do_not_reach():
    """The lightest is meant: what is lighter of the same form falls short at that reach."""
    needed = np.array([4e6, 4e6])
    for found in brackets(*needed, 0.1143, reach_m=0.5):
        assert found.reaches
        chosen = SECTION[found.section]
        for section in sections():
            if section.mass_kg_per_m < chosen.mass_kg_per_m:
                at = bracket_stiffness(FORM[found.form], section, one(0.5), 0.1143)[0]
                assert np.any(at < needed) or section.least_radius_m * 150 < 0.5


def test_nothing_is_offered_beyond_what_clamp_and_base_allow():
    """No steel makes up for a soft clamp."""
    assert brackets(2 * clamp_n_per_m(0.06), 0.0, 0.06) == ()
    assert brackets(8e6, 0.0, 0.0334, base_n_per_m=1e6) == ()
