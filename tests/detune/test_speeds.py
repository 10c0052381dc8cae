"""Speed ranges: what is left of one, and how much slower or faster the machine would run."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.detune import judge
from fieldkit.detune.excitation import Excitation, Goal, bands
from fieldkit.detune.fixes import ChangeSpeed
from fieldkit.detune.rank import detune
from fieldkit.detune.speeds import speed_offers
from fieldkit.job.store import JobText
from fieldkit.span.modes import span_modes
from tests.detune.lines import RUNNING, TAPPED, UP_TO_HZ, booster
from tests.job.sample import FULL

GOAL = Goal(up_to_hz=100.0, margin=0.1)


def made(*hertz: float, sd: float = 0.005) -> judge.Spectrum:
    """Four hundred members with these modes."""
    rng = np.random.default_rng(1)
    all_hz = np.array(hertz) * (1 + sd * rng.standard_normal((400, 1)))
    return judge.Spectrum(all_hz, ("vertical",) * len(hertz), all_hz)


def kept(offers):
    return [o for o in offers if o.change.manner == "keep"]


def test_the_range_on_the_roomy_side_of_the_mode_remains():
    """One mode at 20 Hz, first order 16 to 30 Hz, 10 %: speeds above 20 / 0.9 = 22.2 are clear."""
    spectrum = made(20.0)
    pump = Excitation("pump", (16.0, 30.0), (1.0,))
    (offer,) = kept(speed_offers(spectrum, spectrum, [pump], GOAL))
    assert offer.change.low_hz == pytest.approx(20.0 / 0.9, rel=0.02)
    assert offer.change.high_hz == pytest.approx(30.0)
    assert offer.chance >= GOAL.chance


def test_every_order_counts():
    """The second order meets a mode at 50 Hz from 50 / 2.2 to 50 / 1.8 Hz of speed."""
    spectrum = made(20.0, 50.0)
    pump = Excitation("pump", (16.0, 40.0), (1.0, 2.0))
    (offer,) = kept(speed_offers(spectrum, spectrum, [pump], GOAL))
    assert offer.change.low_hz == pytest.approx(50.0 / 1.8, rel=0.02)


def test_what_is_offered_is_clear_member_by_member():
    spectrum = made(20.0, 50.0, sd=0.03)
    pump = Excitation("pump", (16.0, 40.0), (1.0, 2.0))
    for offer in speed_offers(spectrum, spectrum, [pump], GOAL):
        moved = Excitation("pump", (offer.change.low_hz, offer.change.high_hz), (1.0, 2.0))
        assert offer.chance == judge.chance_clear(spectrum, bands([moved], 0.1), 100.0)
        assert offer.chance >= GOAL.chance


def test_a_fixed_speed_is_moved_to_the_nearest_clear_ones():
    """A mode at 25 Hz on a pump at 25 Hz: 25 / 1.1 = 22.7 and 25 / 0.9 = 27.8 Hz are the edges."""
    spectrum = made(25.0)
    pump = Excitation("pump", (25.0, 25.0), (1.0,))
    offers = {o.change.manner: o.change for o in speed_offers(spectrum, spectrum, [pump], GOAL)}
    assert set(offers) == {"slower", "faster"}
    assert offers["slower"].high_hz == pytest.approx(25 / 1.1, rel=0.03)
    assert offers["slower"].high_hz < 25 / 1.1
    assert offers["faster"].low_hz == pytest.approx(25 / 0.9, rel=0.03)
    assert offers["faster"].low_hz > 25 / 0.9


def test_another_machine_on_the_mode_is_not_cured_by_this_one():
    spectrum = made(25.0)
    machines = [Excitation("pump", (25.0, 25.0)), Excitation("fan", frequency_hz=(25.0, 25.0))]
    assert speed_offers(spectrum, spectrum, machines, GOAL) == []


def test_faster_stops_where_nobody_looked_for_modes():
    """An order below the limit may not pass it: what lies above is not known to be clear."""
    spectrum = made(90.0)
    pump = Excitation("pump", (90.0, 90.0), (1.0,))
    manners = {o.change.manner for o in speed_offers(spectrum, spectrum, [pump], GOAL)}
    assert manners == {"slower"}


def test_a_job_that_allows_only_another_speed_gets_one():
    """Kept by the hidden truth, and told with what it costs."""
    span, truth, found = booster()
    lowest = span_modes(truth, RUNNING, UP_TO_HZ)[0].frequency_hz
    pump = (Excitation("pump", (0.6 * lowest, 1.05 * lowest), (1.0,)),)
    goal = Goal(up_to_hz=UP_TO_HZ, margin=0.1, allow=("speed",))
    answer = detune(span, TAPPED, RUNNING, found, pump, goal)
    best = answer.fixes[0]
    assert isinstance(best.change, ChangeSpeed)
    assert best.kind == "speed"
    assert best.chance >= 0.9
    high = best.change.high_hz * 1.1
    low = best.change.low_hz * 0.9
    assert not any(low <= m.frequency_hz <= high for m in span_modes(truth, RUNNING, UP_TO_HZ))
    assert any("process" in text for text in best.cautions)
    assert "fails" in best.fails


def test_a_speed_is_adopted_into_the_job():
    text = JobText(FULL)
    name = text.job().excitations[0].name
    adopted = text.with_change(ChangeSpeed(name, 20.0, 24.0)).job().excitations[0]
    assert adopted.speed_hz == pytest.approx((20.0, 24.0))
