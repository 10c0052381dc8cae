"""Each running line gets its order, its mode, its amplification and a verdict with a reason."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.detune.diagnosis import (
    CANNOT_TELL,
    FORCED,
    NEAR,
    RESONANCE,
    Line,
    diagnose,
    measured_in_bands,
    strong,
    with_stronger,
    worst,
)
from fieldkit.detune.excitation import Excitation, Goal
from fieldkit.detune.field import field
from fieldkit.detune.known_modes import (
    ASSUMED_DAMPING,
    COMPUTED,
    MEASURED,
    SEEN_RUNNING,
    known_modes,
)
from fieldkit.detune.magnification import Doubtful, amplification, magnification
from fieldkit.detune.match import model_modes
from fieldkit.detune.reduced import build
from fieldkit.detune.unknowns import unknowns_of
from fieldkit.detune.verdict import JudgedMode
from fieldkit.signal.modes import MeasuredMode
from fieldkit.span.layout import State
from fieldkit.span.modes import span_modes
from tests.detune.lines import RUNNING, TAPPED, UP_TO_HZ, booster

EMPTY = State("tapped", (0.0, 0.0))
FULL = State("running", (1.0, 1.0))
PUMP = (Excitation("pump", (23.4, 23.8), (1.0, 2.0)),)
GOAL = Goal(up_to_hz=120.0)


def line(hz, *, rms=1.0, steady=True, direction="vertical"):
    return Line(hz, 0.002, rms, "m/s^2", steady, direction)


def mode(hz, zeta=0.004, *, sd_hz=0.02, direction="vertical", state="running", source="tap"):
    return MeasuredMode(hz, sd_hz, zeta, 0.1 * zeta, direction, 5, 1.0, state, 1.9, source)


def computed(low_hz, median_hz, high_hz, direction="vertical"):
    return JudgedMode(median_hz, low_hz, high_hz, direction, 0.5)


def only(hz, *measured, model=(), goal=GOAL, tapped=EMPTY, **how):
    known = known_modes(measured, model, tapped, FULL)
    return diagnose([line(hz, **how)], known, PUMP, goal)[0]


def test_a_line_beside_a_mode_is_a_resonance_with_its_amplification():
    """47.2 Hz on 46.3 Hz with 0.4 % damping: 1 / sqrt((1 - r^2)^2 + (2 zeta r)^2) by hand."""
    found = only(47.2, mode(46.3))
    r = 47.2 / 46.3
    assert found.verdict == RESONANCE
    assert found.excitation == "pump 2x"
    assert found.amplification.ratio == pytest.approx(r)
    by_hand = 1 / np.hypot(1 - r**2, 2 * 0.004 * r)
    assert found.amplification.best == pytest.approx(by_hand, rel=1e-6)
    assert found.amplification.low < by_hand < found.amplification.high
    assert found.reason.startswith(
        "Resonance: 47.2 Hz sits on pump 2x, 1.9 % from the vertical mode at 46.3 Hz: amplified "
        f"about {by_hand:.0f} times ("
    )


@pytest.mark.parametrize(
    ("mode_hz", "verdict"),
    [(46.3, RESONANCE), (51.0, RESONANCE), (54.0, NEAR), (40.5, NEAR), (60.0, FORCED)],
)
def test_the_two_margins_part_the_verdicts(mode_hz, verdict):
    """47.2 Hz with the margins of 10 % and 20 %."""
    assert only(47.2, mode(mode_hz)).verdict == verdict


def test_the_margin_for_measured_frequencies_is_the_job_s():
    """With 5 % instead of 10 % a mode 8 % away is near, no longer resonant."""
    tight = replace(GOAL, margin_measured=0.05)
    assert only(47.2, mode(51.0)).verdict == RESONANCE
    assert only(47.2, mode(51.0), goal=tight).verdict == NEAR


def test_a_wide_prediction_cannot_tell_and_asks_for_a_tap_as_it_runs():
    """A computed mode anywhere from 35 to 65 Hz says nothing of 47.2 Hz."""
    far = mode(110.0, state="tapped")
    found = only(47.2, far, model=[computed(35.0, 47.697, 65.0)])
    assert found.verdict == CANNOT_TELL
    assert "35.0 to 65.0 Hz" in found.reason
    assert "full and warm" in found.measure_next


@pytest.mark.parametrize("median_hz", [47.0, 90.0])
def test_where_nothing_was_measured_neither_resonance_nor_forced_is_claimed(median_hz):
    """However narrow the usual supports make the computed mode, they may not be the usual ones."""
    found = only(47.2, model=[computed(0.98 * median_hz, median_hz, 1.02 * median_hz)])
    assert (found.verdict, found.amplification) == (CANNOT_TELL, None)
    assert "nothing was measured on this pipe" in found.reason
    assert found.measure_next.startswith("tap the pipe")


def test_a_tapped_mode_stands_for_the_running_one_only_in_the_same_state():
    """Empty against full: the model's running mode is used; full against full: the tap itself."""
    tap, model = mode(51.0, state="tapped"), [computed(46.5, 47.0, 47.6)]
    other = only(47.2, tap, model=model)
    same = only(47.2, tap, model=model, tapped=replace(FULL, name="tapped"))
    assert (other.mode.origin, other.mode.hz) == (COMPUTED, 47.0)
    assert other.mode.damping.median == tap.damping_ratio
    assert (same.mode.origin, same.verdict) == (COMPUTED, RESONANCE)
    alone = only(47.2, tap, tapped=replace(FULL, name="tapped"))
    assert (alone.mode.origin, alone.verdict) == (MEASURED, RESONANCE)


def test_a_mode_seen_running_counts_and_is_said_to_be_so():
    found = only(47.2, mode(46.3, source="running"), model=[computed(45.9, 46.4, 46.9)])
    assert found.mode.origin == SEEN_RUNNING
    assert "(seen running)" in found.reason


def test_without_measured_damping_the_amplification_is_as_wide_as_pipes_are():
    """The usual range from bare pipe to insulated pipe on many supports, and it says so."""
    bare = replace(mode(47.1), damping_ratio=None, damping_sd=None)
    found = only(47.2, bare)
    assert (found.mode.damping.low, found.mode.damping.high) == pytest.approx(ASSUMED_DAMPING)
    assert found.amplification.high > 5 * found.amplification.low
    assert "damping not measured" in found.reason


def test_a_far_mode_means_forced_and_sends_to_the_source():
    """Its amplification does not hang on damping: 1 / |1 - r^2| at r = 47.2 / 90."""
    found = only(47.2, mode(90.0))
    assert found.verdict == FORCED
    assert found.amplification.best == pytest.approx(1 / (1 - (47.2 / 90) ** 2), rel=1e-3)
    assert "source" in found.measure_next


def test_a_line_on_no_order_that_wavers_beside_a_mode_is_the_mode_itself():
    found = only(61.0, mode(61.2), steady=False)
    assert (found.verdict, found.excitation) == (CANNOT_TELL, None)
    assert "no order the job names" in found.reason
    assert "itself" in found.reason


def test_a_steady_line_on_no_order_asks_what_turns_there():
    found = only(61.0, mode(61.2))
    assert found.verdict == RESONANCE
    assert "name it as an [[excitation]]" in found.measure_next


@pytest.mark.parametrize(
    ("hz", "measured", "says"),
    [
        (150.0, [mode(46.0)], "looked for up to 120 Hz only"),
        (47.2, [], "no natural frequency of this pipe as it runs is known"),
        (47.2, [mode(46.0, direction="lateral")], "no mode was measured in vertical direction"),
    ],
)
def test_what_is_not_known_is_said(hz, measured, says):
    found = only(hz, *measured)
    assert (found.verdict, found.mode, found.amplification) == (CANNOT_TELL, None, None)
    assert says in found.reason
    assert found.measure_next


def test_the_mode_beside_a_line_is_one_the_sensor_sees():
    """A lateral mode right at the line is passed over for the vertical one 15 % away."""
    found = only(47.2, mode(47.2, direction="lateral"), mode(54.3))
    assert found.mode.hz == 54.3


def test_the_worst_line_is_shown_first():
    """A weak resonance before a strong forced line; what is on no order comes last."""
    known = known_modes([mode(47.0), mode(90.0)], (), EMPTY, FULL)
    told = diagnose([line(23.6, rms=9.0), line(47.2), line(89.9, rms=2.0)], known, PUMP, GOAL)
    assert [one.verdict for one in told] == [FORCED, RESONANCE, RESONANCE]
    assert worst(told).line.frequency_hz == 47.2
    assert worst([]) is None


def test_only_strong_lines_get_a_verdict():
    assert [one.rms for one in strong([line(1, rms=0.4), line(2, rms=10), line(3, rms=6)])] == [
        10,
        6,
    ]
    assert strong([]) == ()


def test_a_forced_line_that_another_sensor_reads_far_stronger_is_looked_for_there():
    found = only(47.2, mode(90.0))
    lateral = line(47.21, rms=9.0, direction="lateral")
    assert "lateral sensor" in with_stronger(found, [lateral]).measure_next
    assert with_stronger(found, [replace(lateral, rms=1.5)]) == found


def test_measured_modes_are_held_against_bands_with_their_own_margin():
    """53.5 Hz is 12.4 % above pump 2x: inside 20 %, outside the 10 % for measured ones."""
    known = known_modes([mode(53.5), mode(50.0)], [computed(46, 47, 48)], EMPTY, FULL)
    checks = measured_in_bands(known, PUMP, GOAL)
    assert [(check.mode.hz, check.inside) for check in checks] == [(50.0, True), (53.5, False)]
    assert checks[0].band.avoid_high_hz == pytest.approx(2 * 23.8 * 1.1)
    assert measured_in_bands(known, (), GOAL) == ()


@settings(max_examples=30, deadline=None)
@given(
    ratio=st.floats(0.3, 2.0),
    zeta=st.floats(0.001, 0.05),
    mode_doubt=st.floats(0.0, 0.05),
    damping_doubt=st.floats(0.0, 0.5),
)
def test_the_interval_holds_the_best_value_and_shrinks_to_it(
    ratio, zeta, mode_doubt, damping_doubt
):
    """Without any doubt it is the closed form alone."""
    exact = amplification(Doubtful(ratio, 0.0), Doubtful(1.0, 0.0), Doubtful(zeta, 0.0))
    assert exact.low == pytest.approx(exact.high)
    assert exact.best == pytest.approx(float(magnification(ratio, zeta)))
    wide = amplification(
        Doubtful(ratio, 0.0), Doubtful(1.0, mode_doubt), Doubtful(zeta, damping_doubt)
    )
    assert wide.low <= exact.best <= wide.high


def test_the_interval_of_a_resonance_follows_the_damping():
    """At r = 1 exactly it is 1 / (2 zeta): 5 and 95 % of a log-normal damping, by hand."""
    found = amplification(Doubtful(50.0, 0.0), Doubtful(50.0, 0.0), Doubtful(0.01, 0.2))
    assert found.low == pytest.approx(50 * np.exp(-1.6449 * 0.2), rel=0.03)
    assert found.high == pytest.approx(50 * np.exp(1.6449 * 0.2), rel=0.03)


def test_what_a_matched_model_says_holds_on_the_hidden_span():
    """Lines beside the true running modes of a span that was tapped empty.

    The true magnification, from the hidden frequency and damping, lies inside the interval in most
    cases, and no line within 5 % of a true mode is called forced.
    """
    span, truth, found = booster()
    unknowns = unknowns_of(span, (TAPPED, RUNNING))
    model = build(span, RUNNING, unknowns, UP_TO_HZ)
    computed_modes = model_modes(field(span, model, found.ensemble.standard))
    known = known_modes(found.measured, computed_modes, TAPPED, RUNNING)
    goal, inside, tried = Goal(up_to_hz=UP_TO_HZ), 0, 0
    for true in span_modes(truth, RUNNING, 0.6 * UP_TO_HZ):
        if true.direction not in ("vertical", "lateral"):
            continue
        for ratio in (0.95, 0.98, 1.02, 1.05):
            at = line(ratio * true.frequency_hz, direction=true.direction)
            told = diagnose([at], known, (), goal)[0]
            assert told.verdict != FORCED
            exact = float(magnification(ratio, 0.01))
            inside += told.amplification.low <= exact <= told.amplification.high
            tried += 1
    assert tried >= 16
    assert inside >= 0.8 * tried
