"""A span with one concentrated mass: exact transcendental equations and the formulas of handbooks.

Columns of lambda^2 were solved to eight figures from the equations named in each test. The row
mu = 1 of the cantilever is printed in Mathematical Problems in Engineering 2017, article 1568019,
table 1 (1.557298, 16.25009, 50.89584, 105.1983, 179.2320).
"""

import math

import numpy as np
import pytest

from fieldkit.span import eigenvalues
from fieldkit.span.layout import PointMass
from fieldkit.span.pipes import PipeSection
from tests.reference.element_chain import RZ, UY, chain, ends_held, frequencies_hz, kept, matrices
from tests.reference.spans import hold, level_span, unit_hz, vertical_hz

EXACT = {
    # mu: cantilever tip 1st, 2nd, 3rd; pinned centre 1st, 2nd; clamped centre 1st, 2nd symmetric
    0.0: (3.5160153, 22.034492, 61.697214, 9.8696044, 88.826440, 22.373285, 120.90339),
    0.1: (2.9678383, 19.355801, 55.518246, 9.0078186, 82.075415, 19.979493, 112.12181),
    0.5: (2.0162990, 16.901418, 51.700921, 6.9659801, 71.815520, 14.799958, 99.998116),
    1.0: (1.5572979, 16.250085, 50.895843, 5.6795979, 67.888395, 11.818212, 95.756793),
    2.0: (1.1581971, 15.860890, 50.447640, 4.3931438, 65.173990, 8.9944598, 92.953994),
    5.0: (0.75693734, 15.602346, 50.162339, 2.9578730, 63.188013, 5.9782301, 90.969640),
    10.0: (0.54137503, 15.511513, 50.064347, 2.1395129, 62.451643, 4.3025157, 90.248039),
    100.0: (0.17300129, 15.427651, 49.974879, 0.69114375, 61.752717, 1.3830742, 89.570190),
}

PRINTED_2017 = (1.557298, 16.25009, 50.89584, 105.1983, 179.2320)

HANDBOOK = (
    # f = sqrt(c EI/(L^3 (M + a m L)))/(2 pi): case, c, a, tolerance; all from memory.
    # 33/140, 17/35, 13/35: Rayleigh, static shape (Thomson; Rao). 0.24, 0.49, 0.37: Blevins 1979.
    # 0.236, 0.486, 0.383: Roark, table 16.1. 0.2235: in circulation, exact in no useful limit.
    ("tip", 3, 33 / 140, 0.02),
    ("tip", 3, 0.24, 0.02),
    ("tip", 3, 0.236, 0.02),
    ("tip", 3, 0.2235, 0.0425),
    ("pinned", 48, 17 / 35, 0.02),
    ("pinned", 48, 0.486, 0.02),
    ("pinned", 48, 0.49, 0.02),
    ("clamped", 192, 13 / 35, 0.02),
    ("clamped", 192, 0.37, 0.02),
    ("clamped", 192, 0.383, 0.02),
)
CAPILLARY = PipeSection(0.0025, 0.00025)
"""Slender and yet stiff enough that a hundred times its own mass still sways above 0.1 Hz."""
FIRM = 1e8
"""N/m and N m/rad: a hundred million times the capillary's own, without strain on rounding."""
COLUMN = {"tip": 0, "pinned": 3, "clamped": 5}


@pytest.mark.parametrize("mu", EXACT)
def test_cantilever_with_tip_mass(mu):
    """1 + cos b cosh b = mu b (sin b cosh b - cos b sinh b)."""
    found = eigenvalues.cantilever_with_tip_mass(mu, 3) ** 2
    assert found == pytest.approx(EXACT[mu][:3], rel=1e-7)


@pytest.mark.parametrize("mu", EXACT)
def test_pinned_with_centre_mass(mu):
    """tan l - tanh l = 4/(mu b), l = b/2."""
    found = eigenvalues.pinned_with_centre_mass(mu, 2) ** 2
    assert found == pytest.approx(EXACT[mu][3:5], rel=1e-7)


@pytest.mark.parametrize("mu", EXACT)
def test_clamped_with_centre_mass(mu):
    """2 (cos l sinh l + sin l cosh l) = mu b (1 - cos l cosh l), l = b/2."""
    found = eigenvalues.clamped_with_centre_mass(mu, 2) ** 2
    assert found == pytest.approx(EXACT[mu][5:], rel=1e-7)


def test_published_row_of_equal_masses():
    """The five values printed in 2017 for a tip mass equal to the beam's."""
    found = eigenvalues.cantilever_with_tip_mass(1.0, 5) ** 2
    assert found == pytest.approx(PRINTED_2017, rel=6e-7)


@pytest.mark.parametrize(("case", "c", "a", "tolerance"), HANDBOOK)
@pytest.mark.parametrize("mu", EXACT)
def test_handbook_formula_is_close_to_exact(case, c, a, tolerance, mu):
    """Within 2 % (4 % for a = 0.2235, whose worst error, massless, is 4.2 %)."""
    by_formula = math.sqrt(c / (mu + a))
    assert by_formula == pytest.approx(EXACT[mu][COLUMN[case]], rel=tolerance)


def test_formulas_exact_without_mass():
    """The a that makes each formula exact at mu = 0: 0.242672, 0.492767, 0.383567."""
    first = [EXACT[0.0][COLUMN[case]] for case in ("tip", "pinned", "clamped")]
    found = np.array([3, 48, 192]) / np.square(first)
    assert found == pytest.approx([0.242672, 0.492767, 0.383567], abs=1e-6)


def by_elements(ends, mu, at, modes):
    """lambda^2 of 80 slender elements of the package, a mass over the beam's at a share ``at``."""
    k, m = matrices(chain(80, 1.0, 1.0, 1.0))
    node = round(80 * at)
    m[6 * node + UY, 6 * node + UY] += mu
    mask = kept(len(k), (UY, RZ), ends_held(ends))
    return 2 * math.pi * frequencies_hz(k, m, mask, modes)


@pytest.mark.parametrize("mu", EXACT)
def test_elements_meet_the_exact_columns(mu):
    """Tip mass modes 1-3, centre masses modes 1 and 3 (mode 2 does not feel them), to 1e-5."""
    tip, pinned, clamped = EXACT[mu][:3], EXACT[mu][3:5], EXACT[mu][5:]
    assert by_elements("clamped-free", mu, 1.0, 3) == pytest.approx(tip, rel=1e-5)
    assert by_elements("pinned-pinned", mu, 0.5, 3)[::2] == pytest.approx(pinned, rel=1e-5)
    assert by_elements("clamped-clamped", mu, 0.5, 3)[::2] == pytest.approx(clamped, rel=1e-5)


@pytest.mark.parametrize("mu", EXACT)
def test_span_model_meets_the_exact_columns(mu):
    """The whole span model on a pipe of L/D = 300, whose shear takes up to 1.5e-4 of mode 1."""
    length = 300 * CAPILLARY.outside_diameter_m
    mass = mu * 7850 * CAPILLARY.wall_area_m2 * length
    for ends, at, column in (("free", 1.0, 0), ("pinned", 0.5, 3), ("clamped", 0.5, 5)):
        first = hold(0.0, "pinned" if ends == "pinned" else "clamped", FIRM)
        last = [] if ends == "free" else [hold(length, ends, FIRM)]
        span = level_span(length, [first, *last], (PointMass(at * length, mass),), CAPILLARY)
        unit = unit_hz(span, length)
        found = vertical_hz(span, 1, 40 * unit)[0] / unit
        assert found == pytest.approx(EXACT[mu][column], rel=2e-4)
