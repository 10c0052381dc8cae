"""The guided tap test: phases, verdicts, modes, and what to do next."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from fieldkit.capture.blow import read_blow
from fieldkit.capture.enough import Expected, best_station, next_place, with_more, worth
from fieldkit.capture.guide import Guide
from fieldkit.capture.joint import JointReading
from fieldkit.capture.places import Ear, Place
from fieldkit.capture.verdict import CUT_SHORT, MACHINE, NO_BLOW
from fieldkit.signal.modes import MeasuredMode
from fieldkit.signal.taps import TapSearch, find_taps
from tests.capture.practice_rig import AT, Rig
from tests.capture.rig import until

RATE_HZ = 4000


def test_three_good_taps_find_the_modes_of_the_rig() -> None:
    """24 and 61 Hz within four of their stated standard deviations; then the other direction."""
    rig = Rig()
    shots = [rig.struck() for _ in range(3)]
    assert [shot.latest.verdict.kind for shot in shots if shot.latest] == ["usable"] * 3
    assert [shot.worth.more for shot in shots] == [2, 1, 0]
    estimate = shots[-1].estimate
    assert estimate is not None
    assert shots[-1].estimated_from == 3
    for mode, truth in zip(estimate.modes, (24.0, 61.0), strict=True):
        assert abs(mode.frequency_hz - truth) < 4 * mode.frequency_sd_hz
        assert mode.damping_ratio == pytest.approx(0.012, abs=4 * (mode.damping_sd or 0.0))
        assert (mode.taps, mode.direction, mode.at_m) == (3, "vertical", 1.0)
    assert shots[-1].advice.startswith("vertical is done")
    assert shots[-1].advice.endswith("turn sensor and hammer to lateral")
    assert shots[-1].record_s == pytest.approx(6 / (2 * np.pi * 24.0 * 0.012), rel=0.05)
    rig.test.stop()


def test_a_blow_is_told_as_seen_before_it_is_judged() -> None:
    """Listening, armed, ringing: within 20 ms of the blow the screen can say so."""
    rig = Rig()
    assert rig.run(1.0).phase == "listening"
    rig.armed()
    assert rig.test.snapshot().instruction == "armed: strike once"
    rig.source.tap()
    shot = rig.run(0.04)
    assert shot.phase == "recording"
    assert shot.instruction == "blow seen: it rings, touch nothing"
    assert shot.ringing_s is not None
    assert shot.ringing_s < 0.04
    rig.test.stop()


@pytest.mark.parametrize(
    ("fault", "kind", "change"),
    [
        ("clipped", "clipped", "lower the input level"),
        ("double", "double", "rebound once"),
        ("soft", "weak", "strike harder"),
        ("gap", "frames missing", "strike again"),
    ],
)
def test_a_faulty_blow_is_refused_with_what_to_change(fault: str, kind: str, change: str) -> None:
    """And it counts for nothing."""
    rig = Rig()
    shot = rig.struck(fault=fault)
    assert shot.latest is not None
    assert shot.latest.verdict.kind == kind
    assert change in shot.latest.verdict.change
    assert shot.estimate is None
    assert shot.worth.more == 3
    assert rig.struck().latest.verdict.usable  # type: ignore[union-attr]
    rig.test.stop()


def test_a_blow_inside_the_hold_off_makes_the_earlier_one_double() -> None:
    """Struck again after 1.2 s, while it still rings and is recorded."""
    rig = Rig()
    rig.armed()
    rig.source.tap()
    rig.run(1.2)
    rig.source.tap()
    rig.run(4.0)
    rig.armed()
    shot = rig.thought()
    assert [blow.verdict.kind for blow in shot.blows] == ["double"]
    assert "struck again 1.2 s later" in shot.blows[0].verdict.what
    rig.test.stop()


def test_beside_a_running_machine_blows_count_and_its_lines_are_no_modes() -> None:
    """2100 rpm: 35 Hz lies between the modes and is told as a tone."""
    rig = Rig()
    rig.source.machine(on=True, speed_rpm=2100.0)
    rig.run(3.0)
    rig.struck(2.0, quiet_s=4.0)
    shot = rig.struck(2.0, quiet_s=4.0)
    assert [blow.verdict.kind for blow in shot.blows] == ["usable", "usable"]
    assert shot.estimate is not None
    assert [round(m.frequency_hz) for m in shot.estimate.modes] == [24, 61]
    assert any(abs(tone.frequency_hz - 35.0) < 0.1 for tone in shot.estimate.tones)
    rig.test.stop()


def test_what_a_machine_drowns_is_laid_to_the_machine() -> None:
    """A thump that is lost in a steady vibration; without it, it is no blow at all."""
    time_s = np.arange(5 * RATE_HZ) / RATE_HZ
    noise = 1e-3 * np.random.default_rng(5).standard_normal(len(time_s))
    machine = 0.3 * np.sin(2 * np.pi * 24.7 * time_s) + 0.1 * np.sin(2 * np.pi * 49.4 * time_s)
    loud = read_blow(machine + noise, RATE_HZ, 2 * RATE_HZ)
    assert loud.verdict.kind == MACHINE
    assert "24.7 Hz" in loud.verdict.what
    assert read_blow(noise, RATE_HZ, 2 * RATE_HZ).verdict.kind == NO_BLOW


def test_a_decay_that_is_cut_while_it_rings_is_short() -> None:
    """Two seconds of a mode that falls by 2 dB in that time."""
    time_s = np.arange(4 * RATE_HZ) / RATE_HZ - 2.0
    decay = np.exp(-0.12 * time_s) * np.sin(2 * np.pi * 19.0 * time_s) * (time_s >= 0)
    noise = 1e-3 * np.random.default_rng(5).standard_normal(len(time_s))
    reading = read_blow(0.3 * decay + noise, RATE_HZ, 2 * RATE_HZ)
    assert reading.verdict.kind == CUT_SHORT
    assert "the next record is longer" in reading.verdict.change
    guide = replace(Guide(), record_s=2.5)
    joint = JointReading(0, reading.verdict, guide.ears, (reading,), 0, ())
    assert guide.read(joint).record_s == 5.0


def test_every_reason_not_to_use_a_tap_refuses_the_blow(monkeypatch) -> None:
    """Also one that the guide has no word of its own for."""
    time_s = np.arange(5 * RATE_HZ) / RATE_HZ - 2.0
    decay = 0.3 * np.exp(-3 * time_s) * np.sin(2 * np.pi * 19.0 * time_s) * (time_s >= 0)
    noise = 1e-3 * np.random.default_rng(5).standard_normal(len(time_s))
    assert read_blow(decay + noise, RATE_HZ, 2 * RATE_HZ).verdict.usable

    def judged(*words: object, **more: object) -> TapSearch:
        search = find_taps(*words, **more)  # type: ignore[arg-type]
        tap = replace(search.taps[0], usable=False, reasons=("touched: by a hand; let go",))
        return replace(search, taps=(tap,))

    monkeypatch.setattr("fieldkit.capture.blow.find_taps", judged)
    reading = read_blow(decay + noise, RATE_HZ, 2 * RATE_HZ)
    assert (reading.verdict.kind, reading.verdict.what) == ("not usable", "touched: by a hand")
    assert reading.record is None


def test_a_blow_set_aside_leaves_the_estimate_and_can_come_back() -> None:
    """It is marked by its frame, and never deleted."""
    rig = Rig()
    rig.struck()
    two = rig.struck()
    assert two.estimated_from == 2
    rig.test.set_aside()
    one = rig.thought()
    assert one.estimated_from == 1
    assert [blow.set_aside for blow in one.blows] == [False, True]
    assert rig.marks == [(two.blows[1].frame, True)]
    rig.test.take_in(2)
    assert rig.thought().estimated_from == 2
    rig.test.set_aside(1)
    rig.test.set_aside(2)
    assert rig.thought().estimate is None
    rig.test.stop()


def test_another_direction_is_estimated_on_its_own() -> None:
    """Sideways it finds the sideways modes, and the first ones stay known."""
    rig = Rig()
    rig.struck()
    sideways = Place("lateral", 1.0)
    rig.source.move([type(rig.source.sensors[0])(1.0, "lateral")])
    rig.test.move_to([Ear(0, sideways)])
    shot = rig.struck()
    assert shot.places == (sideways,)
    assert shot.estimate is not None
    assert [round(m.frequency_hz, 1) for m in shot.estimate.modes] == [19.2, 48.8]
    assert {place for place, _ in shot.estimates} == {AT, sideways}
    rig.test.stop()


def test_a_record_that_cannot_be_read_is_told_and_the_next_one_counts(monkeypatch) -> None:
    """A fault inside must not end the test."""
    rig = Rig()

    def broken(*_words: object, **_more: object) -> None:
        raise ArithmeticError("made to fail")

    with monkeypatch.context() as patch:
        patch.setattr("fieldkit.capture.guided_test.read_joint", broken)
        rig.armed()
        rig.source.tap()
        rig.run(6.0)
        until(lambda: rig.test.snapshot().notice)
    assert "ArithmeticError: made to fail" in rig.test.snapshot().notice
    shot = rig.struck()
    assert [blow.verdict.kind for blow in shot.blows] == ["usable"]
    rig.test.stop()


def mode(frequency_hz: float, sd_hz: float, taps: int = 3, strength: float = 1.0) -> MeasuredMode:
    return MeasuredMode(frequency_hz, sd_hz, 0.01, 0.001, taps=taps, strength=strength)


def test_blows_are_worth_it_as_long_as_they_lower_what_matters() -> None:
    """The standard deviation falls with the root of their number; five are enough."""
    assert worth((), 0).more == 3
    assert worth((mode(20, 0.01),), 3).more == 0
    assert worth((mode(20, 0.05),), 3).more == 2
    assert worth((mode(20, 0.045),), 3).more == 1 + (0.045 / 20 / 2e-3) ** 2 * 3 // 4
    assert worth((mode(20, 0.01), mode(47, 0.01, taps=1)), 3).more == 1
    assert worth((mode(20, 0.5),), 5).more == 0
    assert "play" in worth((mode(20, 0.5),), 5).why
    assert with_more(0.02, 3, 1) == pytest.approx(0.02 * np.sqrt(3 / 4))


def test_a_place_where_a_mode_stands_still_is_left() -> None:
    """At the middle of a beam the second mode has its node; a quarter further it moves."""
    station = np.linspace(0, 4, 81)
    beam = [
        Expected(20.0, station, np.abs(np.sin(np.pi * station / 4))),
        Expected(80.0, station, np.abs(np.sin(np.pi * station / 2))),
    ]
    said = next_place((mode(20, 0.01),), 3, 2.0, beam)
    assert "80.0 Hz hardly moves at 2.00 m" in said
    best = best_station(beam, 200.0)
    assert min(abs(best - 4 * 0.3333), abs(best - 4 * 0.6667)) < 0.15
    assert next_place((mode(20, 0.01),), 3, best, beam) == ""
    assert "node" in next_place((mode(20, 0.01), mode(80, 0.1, strength=0.01)), 3, 2.0)


def test_a_loss_that_the_clock_finds_late_takes_the_blow_back() -> None:
    """Judged usable already, and then frames turn out to be missing within it; the one before it
    still counts."""
    rig = Rig()
    rig.struck()
    usable = rig.struck().latest
    assert usable is not None
    assert usable.verdict.usable
    assert usable.joint is not None
    late = rig.source.block(rig.frame)
    within = rig.frame - usable.joint.end + 10
    rig.test.feed(replace(late, lost_frames=400, cause="silence", within_frames=within))
    shot = rig.thought()
    assert [blow.verdict.kind for blow in shot.blows] == ["usable", "frames missing"]
    assert "silence" in shot.blows[1].verdict.what
    until(lambda: rig.test.snapshot().estimated_from == 1)
    rig.test.stop()
