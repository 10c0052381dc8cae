"""How far modes are kept from excitations, and where machines excite.

API 618, 5th edition, as two secondary texts give it: 20 % of a predicted frequency, 10 % on the
actual machine. Orders: rpm/60 times the order; the examples are computed.
"""

import pytest

from fieldkit.detune.excitation import Excitation, Goal, bands, clear_of_all

ORDERS = (
    # name, low and high speed (r/min), order: frequencies (Hz)
    ("pump unbalance", 1480.0, 1480.0, 1, (24.667, 24.667)),
    ("pump vanes", 1480.0, 1480.0, 7, (172.667, 172.667)),
    ("double acting", 895.0, 895.0, 1, (14.917, 14.917)),
    ("double acting", 895.0, 895.0, 2, (29.833, 29.833)),
    ("speed range", 900.0, 1200.0, 2, (30.0, 40.0)),
)


def test_margins_are_those_of_the_standard_unless_the_job_says_otherwise():
    """20 % predicted, 10 % measured."""
    goal = Goal()
    assert goal.margin == pytest.approx(0.20)
    assert goal.margin_measured == pytest.approx(0.10)


@pytest.mark.parametrize(("name", "low", "high", "order", "expected"), ORDERS)
def test_order_of_a_machine(name, low, high, order, expected):
    """Examples of shaft and blade frequencies, and a range of speeds at both its ends."""
    band = bands([Excitation(name, (low / 60, high / 60), (order,))], 0.2)[0]
    assert (band.low_hz, band.high_hz) == pytest.approx(expected, abs=5e-4)


def test_a_mode_at_the_margin_is_clear_and_within_it_is_not():
    """Around 100 Hz with 20 %: 80 and 120 Hz stand just outside, 81 and 119 within."""
    kept = bands([Excitation("line", frequency_hz=(100.0, 100.0))], 0.2)
    assert [bool(clear_of_all(hz, kept)) for hz in (79.9, 81.0, 119.0, 120.1)] == [
        True,
        False,
        False,
        True,
    ]
