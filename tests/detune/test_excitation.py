"""Excitations and the bands they forbid."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from fieldkit.detune.excitation import Excitation, Goal, bands, clear_of_all
from fieldkit.detune.screen import merged

PUMP = Excitation("pump", (24.0, 25.0), (1.0, 2.0))
RIPPLE = Excitation("ripple", frequency_hz=(100.0, 100.0))


def test_each_order_of_a_speed_range_is_one_band_widened_by_the_margin():
    first, second, third = bands((RIPPLE, PUMP), 0.2)
    assert (first.name, first.low_hz, first.high_hz) == ("pump 1x", 24.0, 25.0)
    assert (first.avoid_low_hz, first.avoid_high_hz) == pytest.approx((19.2, 30.0))
    assert (second.low_hz, second.avoid_high_hz) == pytest.approx((48.0, 60.0))
    assert (third.name, third.avoid_low_hz) == ("ripple", pytest.approx(80.0))


def test_separation_is_relative_to_the_excitation_itself():
    band = bands((PUMP,), 0.2)[0]
    assert band.separation(12.0) == pytest.approx(0.5)
    assert band.separation(24.5) == 0.0
    assert band.separation(50.0) == pytest.approx(1.0)


def test_overlapping_bands_join_and_stop_at_the_limit():
    forbidden = bands((Excitation("a", frequency_hz=(10.0, 10.0)),
                       Excitation("b", frequency_hz=(12.0, 12.0)),
                       Excitation("c", frequency_hz=(90.0, 90.0)),
                       Excitation("d", frequency_hz=(300.0, 300.0))), 0.2)  # fmt: skip
    assert merged(forbidden, 100.0) == [
        pytest.approx((8.0, 14.4)),
        pytest.approx((72.0, 100.0)),
    ]


@given(st.lists(st.floats(1, 200), min_size=1, max_size=20))
def test_clear_means_held_by_no_band(frequencies):
    forbidden = bands((PUMP, RIPPLE), 0.2)
    clear = clear_of_all(np.array(frequencies), forbidden)
    assert list(clear) == [not any(b.holds(f) for b in forbidden) for f in frequencies]


def test_keep_outs_forbid_stations():
    goal = Goal(keep_out_m=((1.0, 1.6),))
    assert goal.may_attach(0.9)
    assert not goal.may_attach(1.3)
