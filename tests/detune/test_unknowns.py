"""What nobody knows exactly, as numbers."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from fieldkit.detune.evidence import Evidence
from fieldkit.detune.match import match
from fieldkit.detune.scatter import as_installed
from fieldkit.detune.unknowns import member_span, member_state, unknowns_of
from fieldkit.signal.modes import MeasuredMode
from fieldkit.span.layout import Believed, State, Support
from fieldkit.span.modes import span_modes
from tests.detune.lines import RUNNING, UP_TO_HZ, hidden, straight

HALF_KNOWN = State("tapped", (0.0, 1.0))


def test_the_wall_of_a_schedule_is_thin_rather_than_thick():
    """Mill tolerance: 12.5 % below nominal is the limit (ASME B36.10M, from memory)."""
    (wall,) = [u for u in unknowns_of(straight(), ()) if u.role == "wall"]
    low, median, high = wall.at(np.array([-2.33, 0.0, 2.33]))
    assert 0.875 <= low < 0.9
    assert 0.97 < median < 1.0
    assert 1.0 < high < 1.03


def test_a_wall_in_millimetres_is_as_likely_thick_as_thin():
    span = straight()
    gauged = replace(span, pipe=replace(span.pipe, label="NPS 3 wall 5.1 mm"))
    (wall,) = [u for u in unknowns_of(gauged, ()) if u.role == "wall"]
    low, high = wall.at(np.array([-1.0, 1.0]))
    assert 1 - low == pytest.approx(high - 1)


@pytest.mark.parametrize("role", ["spring", "mass", "length", "modulus", "wall", "fill"])
def test_slopes_are_those_of_the_values(role):
    unknown = next(u for u in unknowns_of(straight(), (HALF_KNOWN,)) if u.role == role)
    z, step = np.linspace(-2.5, 2.5, 11), 1e-4
    slope = (unknown.at(z + step) - unknown.at(z - step)) / (2 * step)
    assert unknown.slope(z) == pytest.approx(slope, rel=1e-3, abs=1e-6)


def test_what_the_job_believes_of_a_support_replaces_its_kind():
    span = straight()
    supports = (span.supports[0], Support(4.1, "clamp", vertical=Believed(5e6, 0.7)))
    found = unknowns_of(replace(span, supports=supports), ())
    (spring,) = [u for u in found if u.name == "support 2 vertical at 4.1 m"]
    assert (spring.centre, spring.spread) == (5e6, 0.7)


def test_a_fill_nobody_knows_is_told_by_the_tap():
    """Tapped half full by somebody who forgot: the posterior holds the true fill."""
    span, truth = straight(), hidden(straight(), 5)
    filled = replace(HALF_KNOWN, fill=(0.75, 0.75))
    modes = tuple(
        MeasuredMode(m.frequency_hz, 5e-4 * m.frequency_hz, 0.01, 0.001, m.direction, taps=5)
        for m in span_modes(truth, filled, UP_TO_HZ)
        if m.direction in ("vertical", "lateral")
    )
    found = match(span, HALF_KNOWN, RUNNING, Evidence(modes), up_to_hz=UP_TO_HZ)
    (fill,) = [p for p in found.parameters if p.name == "fill, tapped"]
    assert (fill.prior_low, fill.prior_high) == pytest.approx((0.05, 0.95), abs=0.01)
    assert fill.low - 0.05 <= 0.75 <= fill.high + 0.05


def test_a_member_takes_its_own_fill_and_wall():
    span = straight()
    unknowns = unknowns_of(span, (HALF_KNOWN, RUNNING))
    z = np.zeros(len(unknowns))
    z[[u.role == "wall" for u in unknowns]] = -1.0
    z[[u.role == "fill" for u in unknowns]] = 1.0
    assert member_span(span, unknowns, z).pipe.wall_m < 0.97 * span.pipe.wall_m
    assert member_state(HALF_KNOWN, unknowns, z).fill == pytest.approx((0.841, 0.841), abs=1e-3)


def test_installation_scatters_as_far_as_it_is_said_to():
    """5 and 95 % of two hundred brackets, whatever the seed."""
    for seed in (20, 21):
        scatter = as_installed(200, np.random.default_rng(seed))
        stiffness = np.quantile(np.log(scatter.stiffness_factor), (0.05, 0.95))
        assert stiffness == pytest.approx((-1.645 * 0.35, 1.645 * 0.35), rel=0.02)
        assert np.std(scatter.place_m) == pytest.approx(0.015, rel=0.02)
        tied = np.corrcoef(np.log(scatter.stiffness_factor), scatter.place_m)[0, 1]
        assert abs(tied) < 0.2
