"""What a measurement says against the model is named, with what may explain it."""

from __future__ import annotations

from dataclasses import replace

import pytest

from fieldkit.detune.contradictions import not_seen, ovalling_hz, unexplained
from fieldkit.detune.excitation import Excitation
from fieldkit.detune.field import field
from fieldkit.detune.matched import Pair
from fieldkit.detune.reduced import build
from fieldkit.detune.unknowns import unknowns_of
from fieldkit.detune.visible import follow_modes
from fieldkit.signal.modes import MeasuredMode
from fieldkit.span.layout import State
from tests.detune.lines import RUNNING, TAPPED, UP_TO_HZ, booster, straight

PUMP = (Excitation("pump", (24.0, 25.0), (1.0, 2.0)),)


def peak(hz, strength=0.5, zeta=0.01, direction="vertical", **more):
    return MeasuredMode(hz, 0.02, zeta, 0.001, direction, 5, strength, **more)


def paired(hz):
    return Pair(1, peak(hz), hz, hz, hz, hz, "vertical", None)


def told(mode, pairs=(), tapped=TAPPED):
    return unexplained([mode], pairs, straight(), tapped, PUMP)


def test_a_weak_peak_and_one_seen_running_are_passed_over():
    assert told(peak(33.0, strength=0.05)) == ()
    assert told(peak(33.0, source="running")) == ()


@pytest.mark.parametrize(
    ("mode", "pairs", "says"),
    [
        (peak(24.5), (), "sits on pump 1x"),
        (peak(31.0), (paired(30.0),), "support with play"),
        (peak(33.0, zeta=0.08), (), "foundation"),
        (peak(33.0), (), "a line joined to this one"),
        (peak(5000.0), (), "the pipe wall itself may oval"),
    ],
)
def test_each_cause_that_the_numbers_allow_is_named_with_a_check(mode, pairs, says):
    found = told(mode, pairs)[0]
    assert found.kind == "peak"
    assert says in found.text
    assert found.check


def test_contents_are_suspected_only_where_there_are_any():
    full = State("tapped", (1.0, 1.0))
    assert "contents may resonate" in told(peak(33.0), tapped=full)[0].text
    assert "contents" not in told(peak(33.0))[0].text


def test_the_wall_is_not_blamed_for_a_low_peak():
    assert "oval" not in told(peak(33.0))[0].text


def test_the_ovalling_frequency_of_a_thin_ring():
    """omega^2 = 36/5 E' h^2 / (12 rho R^4): 12 mm wall, 0.5 m radius, steel, 31.5 Hz by hand."""
    span = straight()
    pipe = replace(span.pipe, outside_diameter_m=1.012, wall_m=0.012)
    modulus = span.material.modulus_at(TAPPED.temperature_k) / (1 - 0.3**2)
    rho = span.material.density_kg_per_m3
    by_hand = (7.2 * modulus * 0.012**2 / (12 * rho * 0.5**4)) ** 0.5 / 6.283185307
    assert ovalling_hz(replace(span, pipe=pipe), TAPPED) == pytest.approx(by_hand, rel=1e-6)
    assert by_hand == pytest.approx(31.5, rel=0.01)


def tapped_modes():
    span, _, found = booster()
    unknowns = unknowns_of(span, (TAPPED, RUNNING))
    model = build(span, TAPPED, unknowns, UP_TO_HZ)
    return found, follow_modes(field(span, model, found.ensemble.standard), UP_TO_HZ)


def test_a_mode_that_had_to_show_and_did_not_is_named():
    """The lowest vertical mode is left out of the measurement at three places."""
    found, watched = tapped_modes()
    first = min(
        (p for p in found.pairs if p.direction == "vertical"), key=lambda p: p.measured.frequency_hz
    )
    places = (1.9, 5.6, 6.6)
    others = [p for p in found.pairs if p is not first]
    measured = [replace(p.measured, at_m=at) for p in others for at in places]
    kept = [replace(p, measured=replace(p.measured, at_m=1.9)) for p in others]
    missing = not_seen(watched, "tapped", measured, kept)
    assert [round(one.frequency_hz) for one in missing] == [round(first.model_hz)]
    assert missing[0].direction == "vertical"
    assert "should have shown" in missing[0].text


def test_nothing_is_missed_where_every_mode_was_paired():
    found, watched = tapped_modes()
    measured = [replace(p.measured, at_m=5.6) for p in found.pairs]
    pairs = [replace(p, measured=replace(p.measured, at_m=5.6)) for p in found.pairs]
    missing = not_seen(watched, "tapped", measured, pairs)
    assert all(one.direction == "axial" for one in missing)
