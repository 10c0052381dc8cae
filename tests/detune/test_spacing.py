"""The spacing to choose: against closed forms, and consistent with its own curve."""

from __future__ import annotations

import math
from itertools import pairwise

import pytest

from fieldkit.detune.excitation import Excitation, bands
from fieldkit.detune.spacing import (
    Held,
    SupportRow,
    equal_spacing,
    prior_row,
    row_kinds,
    usual_kind,
)
from fieldkit.span.layout import Leg, Span, State, Support
from fieldkit.span.line import line_of
from fieldkit.span.materials import material
from fieldkit.span.pipes import standard_pipe

FULL = State("running", (1.0, 1.0))
RIGID = SupportRow("clamp", *[Held(1e11, 1e11, 1e11)] * 2, "prior")


def line(size: str = "NPS 4") -> Span:
    return Span(
        standard_pipe(size, "40"), material("carbon steel"), (Leg((1.0, 0.0, 0.0), 6.0),),
        (Support(0.0, "anchor"), Support(3.0, "u-bolt"), Support(6.0, "u-bolt")),
        contents_density_kg_per_m3=1000.0,
    )  # fmt: skip


def fan(*hz: float, margin: float = 0.0):
    return bands([Excitation("fan", None, (1.0,), hz)], margin)


def pinned_spacing_m(span: Span, hz: float) -> float:
    """l at which (pi/2) sqrt(EI/m) / l^2 is a frequency."""
    found = line_of(span, FULL)
    per_m = found.own_mass_kg_per_m + found.contents_kg_per_m
    return math.sqrt(math.pi / 2 / hz * math.sqrt(found.bending_n_m2 / per_m))


@pytest.mark.parametrize("size", ["NPS 2", "NPS 4", "NPS 12"])
def test_rigid_supports_give_the_pinned_spacing(size):
    """First mode of any number of equal pinned spans is pi; shear takes up to 2 % off at 10 Hz."""
    span = line(size)
    found = equal_spacing(span, FULL, RIGID, fan(9.0, 10.0), 200.0)
    assert found.above_m == pytest.approx(pinned_spacing_m(span, 10.0), rel=0.01)
    for _, at in found.by_spans:
        assert at == pytest.approx(found.above_m, rel=0.005)


def test_weight_based_spacing_stands_beside_it():
    """ASME B31.1 / MSS SP-69: NPS 4 water 14 ft, gas 17 ft; pinned at 14 ft it is at 13.7 Hz."""
    found = equal_spacing(line(), FULL, RIGID, fan(13.6, 13.65), 200.0)
    assert found.weight_based_m == pytest.approx(14 * 0.3048)
    assert found.above_m == pytest.approx(14 * 0.3048, rel=0.01)
    empty = equal_spacing(line(), State("running", (0.0, 0.0)), RIGID, fan(5.0, 6.0), 200.0)
    assert empty.weight_based_m == pytest.approx(17 * 0.3048)


def test_the_margin_is_part_of_the_edge():
    plain = equal_spacing(line(), FULL, RIGID, fan(9.0, 10.0), 200.0)
    wide = equal_spacing(line(), FULL, RIGID, fan(9.0, 10.0, margin=0.2), 200.0)
    assert wide.top_hz == pytest.approx(12.0)
    assert wide.above_m == pytest.approx(plain.above_m / math.sqrt(1.2), rel=0.01)


def test_softer_supports_ask_for_shorter_spans():
    row = prior_row(line(), "clamp")
    found = equal_spacing(line(), FULL, row, fan(19.0, 20.0), 200.0)
    assert found.above_soft_m is None or found.above_soft_m < found.above_m
    assert found.above_m < pinned_spacing_m(line(), 20.0)
    for before, after in pairwise(found.curve):
        assert after.frequency_hz < before.frequency_hz
        assert after.low_hz <= after.frequency_hz <= after.high_hz


def test_a_gap_between_bands_is_offered_only_where_all_modes_lie_outside():
    """Two narrow bands far apart; between them the first cluster of two spans fits, pi to 3.927."""
    forbidden = (*fan(4.0, 5.0), *fan(60.0, 61.0))
    found = equal_spacing(line(), FULL, RIGID, forbidden, 80.0, spans=2)
    assert found.above_m < found.between_m
    near = min(found.curve, key=lambda p: abs(p.spacing_m - found.between_m))
    assert near.clear
    assert near.frequency_hz > 5.0
    assert found.chosen_m == found.above_m


def test_nothing_is_chosen_without_a_band_or_where_no_spacing_reaches():
    free = equal_spacing(line(), FULL, RIGID, (), 200.0)
    assert (free.top_hz, free.chosen_m, free.by_spans) == (None, None, ())
    soft = SupportRow("hanger", *[Held(1e3, 1e3, 1e3)] * 2, "prior")
    none = equal_spacing(line(), FULL, soft, fan(190.0, 199.0), 200.0)
    assert none.above_m is None
    assert none.above_rigid_m == pytest.approx(pinned_spacing_m(line(), 199.0), rel=0.2)


def test_kinds_that_make_a_row():
    assert set(row_kinds()) == {"clamp", "u-bolt", "guide", "rest", "hanger"}
    assert usual_kind(line()) == "u-bolt"
    assert prior_row(line(), "free") is None
    assert prior_row(line(), "clamp").vertical.median_n_per_m == pytest.approx(1.5e7, rel=1e-6)
