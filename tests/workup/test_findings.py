"""What taps, running records and the model say together, for a whole job."""

from __future__ import annotations

from dataclasses import replace

from fieldkit.detune.evidence import Evidence
from fieldkit.detune.excitation import Excitation, Goal
from fieldkit.job.document import Job
from fieldkit.sheet import findings as told
from fieldkit.workup.findings import findings, with_next_blow
from tests.detune.lines import RUNNING, TAPPED, UP_TO_HZ, booster, booster_answer

PUMP = (Excitation("pump", (12.0, 13.0)),)


def job(**more: object) -> Job:
    return Job(
        "line", "SI", booster()[0], TAPPED, RUNNING, PUMP, goal=Goal(up_to_hz=UP_TO_HZ, **more)
    )


def evidence() -> Evidence:
    return Evidence(booster()[2].measured)


def test_a_change_that_is_not_sure_enough_is_what_the_next_blow_is_for():
    """The best change at 60 %: the blow is rated by how far that change clears the bands."""
    _, answer = booster_answer()
    unsure = replace(answer, chance_now=0.1, fixes=(replace(answer.fixes[0], chance=0.6),))
    found = findings(job(), evidence(), (), booster()[2], unsure)
    assert found.blows
    for blow in found.blows:
        assert "change 1 clears the bands" in blow.about
        assert blow.settles is not None
        assert 0 <= blow.settles <= 1
        assert blow.sd_after <= blow.sd_before
    said = " ".join(told.better_measurement(found, 0.6, 0.9))
    assert found.next_measurement.split(":")[0][:20] in said
    assert told.better_measurement(found, 0.95, 0.9) == []


def test_with_a_sure_change_the_blow_is_rated_by_the_frequencies():
    _, answer = booster_answer()
    sure = replace(answer, chance_now=0.1, fixes=(replace(answer.fixes[0], chance=0.97),))
    found = findings(job(), evidence(), (), booster()[2], sure)
    assert all(blow.settles is None for blow in found.blows)
    assert all("natural frequencies" in blow.about for blow in found.blows)


def test_no_blow_sits_where_nothing_can_be_attached():
    found = findings(job(keep_out_m=((0.0, 5.0),)), evidence(), (), booster()[2], None)
    assert found.blows
    assert all(blow.at_m > 5.0 for blow in found.blows)


def test_before_anything_was_measured_the_first_tap_is_advised():
    """From the usual supports alone; the match has nothing to be told."""
    found = findings(job(), Evidence(), (), None, None)
    assert found.next_measurement.startswith("tap in ")
    assert found.contradictions == ()


def test_a_model_that_the_tap_contradicts_is_not_asked():
    found = findings(job(), evidence(), (), None, None)
    assert (found.blows, found.next_measurement) == ((), "")


def test_the_match_takes_over_the_advice():
    match = booster()[2]
    found = findings(job(), evidence(), (), match, None)
    assert with_next_blow(match, found).next_measurement == found.next_measurement


def test_the_modes_of_a_tap_in_the_running_state_are_held_against_the_bands():
    """As measured, with 10 %; those tapped empty are not."""
    whole = evidence()
    warm = Evidence(tuple(replace(mode, state="running") for mode in whole.modes))
    assert findings(job(), whole, (), booster()[2], None).band_checks == ()
    checks = findings(job(), warm, (), booster()[2], None).band_checks
    assert len(checks) == len(warm.modes)
    assert {round(check.band.avoid_high_hz, 6) for check in checks} == {round(13.0 * 1.1, 6)}
