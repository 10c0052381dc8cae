"""Ticks fall on round values, few enough to read; axes pan and zoom without losing their ends."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.ui.widgets.ticks import (
    amount_text,
    frequency_text,
    linear_ticks,
    log_ticks,
    round_down,
    round_up,
    tick_labels,
    tick_step,
)
from fieldkit.ui.widgets.view_range import Axis


@given(st.floats(1e-9, 1e9), st.integers(1, 40))
@settings(max_examples=80, deadline=None)
def test_steps_are_1_2_or_5_times_a_power_of_ten(span, most):
    step = tick_step(span, most)
    mantissa = float(f"{step:.12e}".split("e")[0])
    assert mantissa in (1.0, 2.0, 5.0)
    assert span / step <= most * (1 + 1e-9)
    assert span / step > most / 2.5000001


@given(st.floats(-1e6, 1e6), st.floats(1e-3, 1e6), st.integers(2, 20))
@settings(max_examples=80, deadline=None)
def test_even_ticks_lie_inside_and_are_few(low, length, most):
    ticks = linear_ticks(low, low + length, most)
    assert len(ticks) <= most + 1
    assert np.all(ticks >= low - 1e-6 * length)
    assert np.all(ticks <= low + length * (1 + 1e-6))


@given(st.floats(1e-6, 1e3), st.floats(0.2, 8), st.integers(2, 20))
@settings(max_examples=80, deadline=None)
def test_decade_ticks_lie_inside_and_are_few(low, decades, most):
    high = low * 10**decades
    ticks = log_ticks(low, high, most)
    assert len(ticks) <= most + 3
    assert np.all((ticks >= low * (1 - 1e-6)) & (ticks <= high * (1 + 1e-6)))
    assert np.all(np.diff(ticks) > 0)


def test_known_axes():
    """Read off by hand."""
    assert linear_ticks(0, 200, 5).tolist() == [0, 50, 100, 150, 200]
    assert log_ticks(1, 1000, 12).tolist() == [1, 2, 5, 10, 20, 50, 100, 200, 500, 1000]
    assert log_ticks(1e-6, 10, 4).tolist() == pytest.approx([1e-6, 1e-4, 1e-2, 1])
    assert log_ticks(20, 60, 5).tolist() == [20, 30, 40, 50, 60]


def test_labels_tell_neighbours_apart_and_carry_no_spare_digit():
    assert tick_labels(np.array([0.0, 0.05, 0.1])) == ["0.00", "0.05", "0.10"]
    assert tick_labels(np.array([0.0, 50.0, 100.0])) == ["0", "50", "100"]
    assert tick_labels(np.array([0.01, 0.1, 1, 10])) == ["0.01", "0.1", "1", "10"]
    assert tick_labels(np.array([0.01, 1])) == ["0.01", "1"]
    assert tick_labels(np.array([0.0, 0.5])) == ["0.0", "0.5"]
    assert tick_labels(np.array([1e-6, 1e-4, 1e-2])) == ["1e-6", "1e-4", "0.01"]
    assert tick_labels(np.array([0.0, 2e5, 4e5])) == ["0", "2e5", "4e5"]
    assert tick_labels(np.array([])) == []


@given(st.floats(0.01, 1e4), st.floats(1e-3, 1e3), st.integers(2, 12))
@settings(max_examples=80, deadline=None)
def test_labels_of_an_axis_are_all_different_and_read_back(low, length, most):
    ticks = linear_ticks(low, low + length, most)
    labels = tick_labels(ticks)
    assert len(set(labels)) == len(labels)
    assert [float(label) for label in labels] == pytest.approx(ticks.tolist(), rel=0.06, abs=1e-9)


def test_texts_of_values():
    assert [frequency_text(f) for f in (7.321, 23.41, 99.96, 148.2)] == [
        "7.32",
        "23.4",
        "100",
        "148",
    ]
    assert amount_text(0.04123, "m/s²") == "0.0412 m/s²"
    assert amount_text(1.2345e-5, "m") == "1.2e-5 m"
    assert amount_text(12345.6) == "12346"
    assert amount_text(0) == "0"
    assert amount_text(float("nan"), "g") == "?"
    assert frequency_text(float("inf")) == "?"


@given(st.floats(1e-9, 1e9))
@settings(max_examples=60, deadline=None)
def test_rounding_brackets_a_value(value):
    assert round_down(value) <= value * (1 + 1e-8)
    assert round_up(value) >= value * (1 - 1e-8)
    assert round_up(value) / round_down(value) <= 2.5000001


AXES = [Axis(0.0, 200.0), Axis(1.0, 1000.0, log=True)]


@pytest.mark.parametrize("axis", AXES)
def test_share_and_value_undo_each_other(axis):
    shares = np.linspace(0, 1, 7)
    assert axis.share(axis.value(shares)) == pytest.approx(shares)


@pytest.mark.parametrize("axis", AXES)
def test_zooming_keeps_the_value_under_the_pointer_in_place(axis):
    about = 42.0
    assert float(axis.zoomed(0.5, about).share(about)) == pytest.approx(float(axis.share(about)))


@pytest.mark.parametrize("axis", AXES)
def test_a_view_never_leaves_its_limits(axis):
    """However it is moved, and it keeps its length when merely moved."""
    there = axis.zoomed(0.1, 30.0)
    for moved in (there.panned(-50), there.panned(50), there.zoomed(1000, 10.0), axis.panned(0.3)):
        kept = moved.kept_within(axis)
        assert kept.low >= axis.low * (1 - 1e-9)
        assert kept.high <= axis.high * (1 + 1e-9)
    far = there.panned(50).kept_within(axis)
    assert np.diff(axis.share([far.low, far.high])) == pytest.approx(0.1)


def test_a_view_cannot_shrink_to_nothing():
    axis = Axis(0.0, 200.0)
    for _ in range(100):
        axis = axis.zoomed(0.5, 77.0).kept_within(Axis(0.0, 200.0))
    assert axis.high - axis.low >= 0.0199


def test_zero_lies_below_every_logarithmic_axis():
    assert Axis(1.0, 10.0, log=True).share([0.0, -1.0]).tolist() == [-np.inf, -np.inf]
