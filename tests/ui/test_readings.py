"""The strip, the readings and the numbers: what they say of a desk, without any screen."""

from __future__ import annotations

from dataclasses import replace

import pytest

from fieldkit.detune.excitation import excitation_band
from fieldkit.sheet.plain import percent
from fieldkit.ui.desk import STEPS, Desk, StepState, step_states
from fieldkit.ui.readings import nearest_mode, reading
from fieldkit.ui.words import plus_minus, sentence, time_left
from tests.ui.glycol import DETUNING, EVIDENCE, FIXES, job, workup

FULL = Desk(job=job(), workup=workup())


def state_of(step: str, desk: Desk) -> StepState:
    return step_states(desk)[step]


def test_nothing_is_started_without_a_job() -> None:
    assert set(step_states(Desk()).values()) == {StepState.TO_DO}


def test_a_finished_workup_makes_every_step_with_a_result_done() -> None:
    for step in ("tap", "running", "match", "detune", "sheet"):
        assert state_of(step, FULL) is StepState.DONE


def test_steps_are_working_while_the_work_goes_on() -> None:
    desk = Desk(job=job(), working=True)
    assert {state_of(step, desk) for step in STEPS} == {StepState.WORKING}


def test_stopped_work_leaves_its_steps_stopped() -> None:
    assert state_of("match", Desk(job=job(), stopped=True)) is StepState.STOPPED


def test_a_match_that_could_not_be_had_is_refused_and_one_without_a_tap_is_not_started() -> None:
    refused = Desk(job=job(), workup=workup(match=None))
    untapped = Desk(job=job(recordings=()), workup=workup(job(recordings=()), match=None, taps=()))
    assert state_of("match", refused) is StepState.REFUSED
    assert state_of("match", untapped) is StepState.TO_DO
    assert state_of("tap", untapped) is StepState.TO_DO


def test_every_view_has_a_reading_at_every_stage() -> None:
    """And none of them is empty or runs over two lines of 78 characters."""
    stages = [
        Desk(),
        Desk(job=job(recordings=())),
        Desk(job=job(), working=True),
        Desk(job=job(), stopped=True),
        Desk(job=job(), failed="The wall is missing; give pipe.wall."),
        FULL,
        Desk(job=job(), workup=workup(match=None, detuning=None)),
    ]
    for desk in stages:
        for view in STEPS:
            assert 10 < len(str(reading(view, desk))) <= 156


def test_the_detune_reading_says_when_no_change_is_enough() -> None:
    short = replace(DETUNING, fixes=FIXES[1:])
    says = str(reading("detune", Desk(job=job(), workup=workup(detuning=short))))
    assert "78 %" in says
    assert "short of the 90 % wanted" in says


def test_the_detune_reading_says_when_nothing_need_be_done() -> None:
    calm = replace(DETUNING, chance_now=0.95)
    assert (
        "leave the pipe as it is"
        in str(reading("detune", Desk(job=job(), workup=workup(detuning=calm)))).lower()
    )


def test_the_running_reading_begins_with_the_verdict_that_matters_most() -> None:
    """24.55 Hz is near the mode at 20.9 Hz; the stronger 49.1 Hz has no mode beside it."""
    says = str(reading("running", FULL))
    assert says.startswith("Near resonance: 24.6 Hz on pump 1x, mode 20.9 Hz 14.9 % away")
    assert "Tap in vertical direction" in says


def test_before_any_verdict_the_running_reading_names_order_and_nearest_mode() -> None:
    says = str(reading("running", Desk(job=job(), workup=workup(findings=None))))
    assert "49.1 Hz" in says
    assert "pump 2x" in says
    assert "42 %" in says  # 28.4 Hz against 49.1 Hz


def test_a_line_two_percent_from_an_order_still_belongs_to_it() -> None:
    assert excitation_band(50.5, FULL.bands) is not None
    assert excitation_band(52.0, FULL.bands) is None


def test_a_mode_seen_in_two_taps_is_not_trusted_for_damping() -> None:
    few = replace(EVIDENCE, modes=(replace(EVIDENCE.modes[0], taps=2),))
    desk = Desk(job=job(), workup=workup(evidence=few))
    assert "too few" in str(reading("tap", desk))


@pytest.mark.parametrize(
    ("share", "text"),
    [(0.0, "<1 %"), (0.004, "<1 %"), (0.5, "50 %"), (0.994, "99 %"), (1, ">99 %")],
)
def test_no_chance_is_called_certain(share: float, text: str) -> None:
    assert percent(share) == text


@pytest.mark.parametrize(
    ("value", "sd", "text"),
    [(23.414, 0.021, "23.41 ±0.02"), (23.414, 0.013, "23.414 ±0.013"), (88.3, 0.2, "88.3 ±0.2"),
     (150.2, 3.0, "150 ±3"), (23.4, 0.0, "23.40 ±0.00"), (53.02, 0.0002, "53.020 ±<0.001")],
)  # fmt: skip
def test_a_value_shows_the_decimals_its_doubt_allows(value: float, sd: float, text: str) -> None:
    assert plus_minus(value, sd) == text


def test_a_sentence_starts_with_a_capital_and_ends() -> None:
    assert sentence("tap again") == "Tap again."
    assert sentence("Why?") == "Why?"
    assert sentence("") == ""


def test_nothing_is_claimed_about_a_line_above_the_highest_mode_looked_at() -> None:
    assert FULL.job is not None
    low_limit = replace(FULL, job=replace(FULL.job, goal=replace(FULL.job.goal, up_to_hz=40.0)))
    assert nearest_mode(low_limit, 49.1) is None
    early = replace(low_limit, workup=workup(findings=None))
    assert "up to 40.0 Hz only" in str(reading("running", early))


@pytest.mark.parametrize(
    ("elapsed_s", "share", "told"),
    [
        (3.0, 0.5, "3 s left"),
        (30.0, 0.1, "4 min 30 s left"),
        (0.5, 0.5, ""),
        (20.0, 0.01, ""),
        (5.0, 1.0, ""),
    ],
)
def test_the_time_left_is_told_once_there_is_a_pace(
    elapsed_s: float, share: float, told: str
) -> None:
    assert time_left(elapsed_s, share) == told
