"""Equal spans against published continuous beams and exact conditions."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.optimize import brentq

from fieldkit.span.equal_spans import equal_span_hz
from fieldkit.span.layout import Leg, Span, State
from fieldkit.span.line import line_of
from fieldkit.span.materials import material
from fieldkit.span.pipes import standard_pipe

EMPTY = State("running", (0.0, 0.0))
# lambda of pinned-pinned continuous beams, first modes; exact from the three-moment equation,
# agrees with Blevins 1979, Formulas for Natural Frequency and Mode Shape, ch. 8 (from memory).
PINNED = {
    1: (3.1415927,),
    2: (3.1415927, 3.9266023),
    3: (3.1415927, 3.5564085, 4.2975297),
    4: (3.1415927, 3.3932313, 3.9266023, 4.4633244),
    5: (3.1415927, 3.3090521, 3.7003601, 4.1529437, 4.5504337),
    10: (3.1415927, 3.1859255, 3.3090521, 3.4883441, 3.7003601),
}
# f/f_pinned of a span on two equal end springs, ends free to turn, K in 48 EI/L^3; exact from
# tan(b/2) + tanh(b/2) = 2 K L^3/(EI b^3).
END_SPRINGS = {0.25: 0.4516, 0.5: 0.5875, 1: 0.7227, 2: 0.8331, 5: 0.9245, 20: 0.9799, 100: 0.9959}


def slender() -> Span:
    """So slender that shear and rotary inertia count for nothing at 10 m spacing."""
    return Span(standard_pipe("NPS 1", "40"), material("carbon steel"), (Leg((1.0, 0, 0), 1.0),))


def unit_hz(spacing_m: float) -> float:
    """Frequency of lambda = 1."""
    line = line_of(slender(), EMPTY)
    per_m = line.own_mass_kg_per_m
    return math.sqrt(line.bending_n_m2 / per_m) / (2 * math.pi * spacing_m**2)


@pytest.mark.parametrize("spans", PINNED)
def test_rigid_supports_give_the_published_continuous_beam(spans):
    spacing = np.array([8.0, 10.0])
    found = equal_span_hz(slender(), EMPTY, spacing, spans, np.full(2, 1e8))
    for at, row in zip(spacing, found, strict=True):
        expected = np.square(PINNED[spans]) * unit_hz(at)
        assert row[: len(expected)] == pytest.approx(expected, rel=3e-4)


@pytest.mark.parametrize("ratio", END_SPRINGS)
def test_one_span_on_end_springs(ratio):
    spacing = np.array([10.0])
    rigidity = line_of(slender(), EMPTY).bending_n_m2
    k = ratio * 48 * rigidity / spacing**3
    found = equal_span_hz(slender(), EMPTY, spacing, 1, k)[0, 0]
    assert found / (math.pi**2 * unit_hz(10.0)) == pytest.approx(END_SPRINGS[ratio], abs=2e-4)


def test_the_third_half_wave_of_a_span_is_still_good():
    """What the number of elements promises: 3 pi within 1 in 100."""
    found = equal_span_hz(slender(), EMPTY, np.array([10.0]), 1, np.array([1e8]))[0]
    assert found[2] == pytest.approx((3 * math.pi) ** 2 * unit_hz(10.0), rel=0.01)


def test_a_line_on_soft_springs_bounces_on_all_of_them():
    """Rigid pipe: sqrt((n + 1) k / (n l m)) / 2 pi."""
    k, spacing, spans = 2e3, 0.5, 4
    found = equal_span_hz(slender(), EMPTY, np.array([spacing]), spans, np.array([k]))[0]
    mass = line_of(slender(), EMPTY).own_mass_kg_per_m * spacing * spans
    bounce = math.sqrt((spans + 1) * k / mass) / (2 * math.pi)
    assert np.min(np.abs(found / bounce - 1)) < 0.02


def test_exact_condition_solves_the_table_used_above():
    """The table of end springs itself, solved anew."""
    for ratio, printed in END_SPRINGS.items():
        b = brentq(
            lambda b, r=ratio: math.tan(b / 2) + math.tanh(b / 2) - 96 * r / b**3, 0.1, 3.1415
        )
        assert (b / math.pi) ** 2 == pytest.approx(printed, abs=6e-5)
