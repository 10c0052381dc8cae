"""Rayleigh's method for point masses against exact answers."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.span import eigenvalues
from fieldkit.span.rayleigh import UniformSpan, bare_mode, deflection, loaded_span_hz
from tests.reference.dynamic_stiffness import Attachment, Beam, natural_frequencies_hz

HELD = ("pinned-pinned", "clamped-pinned", "pinned-clamped", "clamped-clamped")
ENDS = (*HELD, "clamped-free")
SPAN = UniformSpan(3.0, 4.0e5, 11.0)
HOLD = {"pinned": (np.inf, 0.0), "clamped": (np.inf, np.inf), "free": (0.0, 0.0)}


def exact_hz(ends, masses):
    left, right = ends.split("-")
    beam = Beam(SPAN.bending_n_m2, SPAN.mass_kg_per_m)
    attached = [
        Attachment(0.0, *HOLD[left]),
        *(Attachment(share * SPAN.length_m, mass_kg=kg) for share, kg in masses),
        Attachment(SPAN.length_m, *HOLD[right]),
    ]
    return natural_frequencies_hz(beam, SPAN.length_m, attached, 1)[0]


@pytest.mark.parametrize(
    ("ends", "at", "stiffness"),
    [
        # k L^3/EI of the point; any text on strength of materials
        ("clamped-free", 1.0, 3.0),
        ("pinned-pinned", 0.5, 48.0),
        ("clamped-clamped", 0.5, 192.0),
        ("clamped-pinned", 0.5, 768 / 7),
        ("pinned-clamped", 0.5, 768 / 7),
        ("pinned-pinned", 0.25, 3 / (0.25**2 * 0.75**2)),
        ("clamped-clamped", 0.25, 3 / (0.25**3 * 0.75**3)),
    ],
)
def test_deflection_under_a_point_load(ends, at, stiffness):
    """A mass without pipe sags by its weight over the stiffness of the point."""
    weightless = UniformSpan(SPAN.length_m, SPAN.bending_n_m2, 1e-12)
    sag = deflection(weightless, ends, ((at, 1.0),))(np.array([at]))[0]
    unit = 9.80665 * SPAN.length_m**3 / SPAN.bending_n_m2
    assert sag == pytest.approx(unit / stiffness, rel=1e-9)


@pytest.mark.parametrize(
    ("ends", "at", "share"),
    [
        ("pinned-pinned", 0.5, 5 / 384),
        ("clamped-clamped", 0.5, 1 / 384),
        ("clamped-free", 1.0, 1 / 8),
    ],
)
def test_deflection_under_own_weight(ends, at, share):
    """5/384, 1/384 and 1/8 of w L^4/EI; any text on strength of materials."""
    sag = deflection(SPAN, ends, ())(np.array([at]))[0]
    weight = SPAN.mass_kg_per_m * 9.80665
    assert sag == pytest.approx(share * weight * SPAN.length_m**4 / SPAN.bending_n_m2)


@pytest.mark.parametrize("ends", ENDS)
def test_without_masses_it_is_exact(ends):
    """The mode of the bare span gives the eigenvalue itself."""
    known = "clamped-pinned" if ends == "pinned-clamped" else ends
    b = eigenvalues.single_span(known, 1)[0]
    exact = eigenvalues.frequency_hz(b, 3.0, 4.0e5, 11.0)
    assert loaded_span_hz(SPAN, ends, ()) == pytest.approx(exact, rel=1e-9)


@pytest.mark.parametrize("ends", ENDS)
@settings(max_examples=12, deadline=None)
@given(forty=st.integers(0, 40), ratio=st.floats(0.01, 30.0))
def test_one_mass_anywhere(ends, forty, ratio):
    """Never below the exact frequency; at most 2.3 % above it up to ratio 2, 7.5 % beyond."""
    masses = ((forty / 40, ratio * SPAN.mass_kg),)
    exact = exact_hz(ends, masses)
    found = loaded_span_hz(SPAN, ends, masses)
    assert exact * (1 - 1e-9) <= found <= (1.023 if ratio <= 2 else 1.075) * exact


@pytest.mark.parametrize("ends", HELD)
@pytest.mark.parametrize("ratio", [0.1, 0.5, 1.0, 5.0, 30.0])
def test_mass_in_the_middle_half(ends, ratio):
    """Where valves hang in practice the estimate is within 0.6 %."""
    for share in (0.25, 0.4, 0.5, 0.75):
        masses = ((share, ratio * SPAN.mass_kg),)
        assert loaded_span_hz(SPAN, ends, masses) == pytest.approx(exact_hz(ends, masses), rel=6e-3)


@pytest.mark.parametrize("ends", ENDS)
def test_two_masses(ends):
    """Two valves on one span, within 0.3 %."""
    masses = ((0.3, 25.0), (0.7, 12.0))
    assert loaded_span_hz(SPAN, ends, masses) == pytest.approx(exact_hz(ends, masses), rel=3e-3)


@pytest.mark.parametrize(
    ("ends", "at", "stiffness", "share"),
    [
        ("clamped-free", 1.0, 3, 33 / 140),
        ("pinned-pinned", 0.5, 48, 17 / 35),
        ("clamped-clamped", 0.5, 192, 13 / 35),
    ],
)
def test_heavy_mass_meets_the_handbook_form(ends, at, stiffness, share):
    """Rayleigh's sqrt(c EI/(L^3 (M + a m L))) with 33/140, 17/35, 13/35 (from memory)."""
    mass = 20 * SPAN.mass_kg
    k = stiffness * SPAN.bending_n_m2 / SPAN.length_m**3
    by_form = np.sqrt(k / (mass + share * SPAN.mass_kg)) / (2 * np.pi)
    assert loaded_span_hz(SPAN, ends, ((at, mass),)) == pytest.approx(by_form, rel=1e-4)


def test_a_mass_on_a_support_changes_nothing():
    """It does not move."""
    bare = loaded_span_hz(SPAN, "pinned-pinned", ())
    assert loaded_span_hz(SPAN, "pinned-pinned", ((0.0, 80.0),)) == pytest.approx(bare)


def test_bare_mode_is_one_where_it_is_largest():
    """Tip of a cantilever, middle of a symmetric span."""
    for ends, at in (("clamped-free", 1.0), ("pinned-pinned", 0.5), ("clamped-clamped", 0.5)):
        assert bare_mode(ends)(np.array([at]))[0] == pytest.approx(1.0, rel=1e-6)
