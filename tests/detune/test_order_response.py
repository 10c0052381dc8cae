"""Amplification of an order: closed form of one mode, worst over the speed range."""

from __future__ import annotations

import pytest

from fieldkit.detune.excitation import Band, Excitation, bands
from fieldkit.detune.known_modes import COMPUTED, KnownMode, computed_modes
from fieldkit.detune.magnification import Doubtful
from fieldkit.detune.order_response import amplified, order_responses
from fieldkit.sheet.order_response import document, words
from tests.ui import glycol


def mode(hz, damping=0.01, doubt=1e-6):
    return KnownMode(Doubtful(hz, doubt), Doubtful(damping, doubt), "vertical", COMPUTED, True)


def order(low_hz, high_hz) -> Band:
    return bands([Excitation("pump", frequency_hz=(low_hz, high_hz))], 0.0)[0]


def test_a_range_that_reaches_a_mode_drives_it_at_resonance():
    """1 / (2 zeta) at r = 1."""
    assert amplified(order(20.0, 30.0), [mode(25.0)]).times == pytest.approx(50.0)


@pytest.mark.parametrize(("hz", "forcing"), [(40.0, 30.0), (10.0, 20.0)])
def test_beyond_the_range_its_nearest_end_counts(hz, forcing):
    """1 / |1 - r^2| without damping (Thomson, harmonically excited vibration)."""
    found = amplified(order(20.0, 30.0), [mode(hz, 1e-6)])
    assert found.times == pytest.approx(1 / abs(1 - (forcing / hz) ** 2), rel=1e-6)


def test_the_mode_that_answers_most_is_named():
    near, far = mode(32.0), mode(80.0)
    assert amplified(order(20.0, 30.0), [far, near]).mode is near
    assert amplified(order(20.0, 30.0), []) is None


def test_doubt_of_the_mode_widens_the_answer():
    found = amplified(order(24.0, 24.5), [mode(25.0, doubt=0.05)])
    assert found.low < found.times < found.high


def test_orders_above_the_limit_are_left_out():
    both = (order(20.0, 30.0), order(300.0, 310.0))
    found = order_responses(both, both, [mode(25.0)], [mode(60.0)], 200.0)
    assert [one.band for one in found] == [both[0]]
    assert found[0].now.times > found[0].after.times


def test_it_is_told_in_a_sentence_and_in_a_document():
    both = (order(20.0, 30.0),)
    found = order_responses(both, both, [mode(25.0)], [mode(60.0)], 200.0)
    assert words(found) == "Amplified at the worst speed: pump 50x → 1.3x, damping as measured."
    entry = document(found)[0]
    assert entry["now"]["amplification"] == pytest.approx(50.0)
    assert entry["after"]["mode_hz"] == 60.0


def test_damping_after_a_change_is_that_of_the_taps():
    after = computed_modes(glycol.MODES[:2], glycol.FIXES[0].modes_after)
    assert [m.damping.median for m in after[:2]] == [0.0110, 0.0142]
    assert all(m.origin == COMPUTED for m in after)
