"""A change held against the taps made after it, on a span whose truth is known."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.detune.evidence import Evidence
from fieldkit.detune.excitation import Excitation, Goal, bands
from fieldkit.detune.fixes import AddAbsorber, AddSupport
from fieldkit.detune.known_modes import alike
from fieldkit.detune.posterior import Population
from fieldkit.detune.recheck import Question, _require_enough, recheck
from fieldkit.detune.recheck_answer import FAILED, UNSURE, WORKED, AsFound, Recheck
from fieldkit.detune.recheck_modes import Tracked
from fieldkit.detune.recheck_reasons import reasons, weighted_quantiles
from fieldkit.detune.recheck_spans import AS_DRAWN, LOOSE, NOTHING, OTHER, STIFFNESS
from fieldkit.detune.recheck_verdict import Now, judged, verdict
from fieldkit.detune.reduced import Modes
from fieldkit.errors import Refusal
from fieldkit.signal.modes import MeasuredMode
from tests.detune.lines import (
    RUNNING,
    TAPPED,
    booster,
    evidence_of,
    frequencies,
)

DRAWN_N_PER_M = 4e6
CHANGE = AddSupport(6.2, DRAWN_N_PER_M, DRAWN_N_PER_M)
"""In the middle of the long stretch, where the lowest modes move most."""


def question(stands: AddSupport | None, **changes: object) -> Question:
    """The booster line, tapped again with a support in it that is as stiff as given.

    As drawn it lifts the mode at 29 Hz to 46 Hz, past the pump; at a fifth of that to 35 Hz.
    """
    span, truth, match = booster()
    after = truth if stands is None else stands.apply(truth)
    whole = Question(
        span=span,
        tapped=TAPPED,
        running=RUNNING,
        retapped=TAPPED,
        before=Evidence(match.measured),
        match=match,
        after=evidence_of(after, 8),
        change=CHANGE,
        chance_before=0.95,
        excitations=(Excitation("pump", (31.5, 32.5), (1.0,)),),
        goal=Goal(up_to_hz=75.0),
    )
    return replace(whole, **changes)  # type: ignore[arg-type]


@cache
def answered(share: float) -> Recheck:
    """With the support at a share of its stiffness."""
    k = share * DRAWN_N_PER_M
    return recheck(question(AddSupport(6.2, k, k) if share else None))


def test_a_change_that_stands_as_drawn_is_found_inside():
    """Nine in ten modes at least, and nothing is looked for that is not there."""
    found = answered(1.0)
    assert found.ways[0][0] == AS_DRAWN
    seen = [mode for mode in found.promised if mode.inside is not None]
    assert len(seen) >= 3
    assert all(mode.inside for mode in seen)
    assert found.verdict == WORKED
    assert found.next_fixes is None
    assert not found.unexplained


def test_a_support_at_a_fifth_of_its_stiffness_is_told_with_its_stiffness():
    """Reason number one, and its interval holds the truth."""
    found = answered(0.2)
    assert found.verdict == FAILED
    assert found.reasons[0].name == STIFFNESS
    assert found.reasons[0].probability > 0.5
    assert "less stiff than drawn" in found.reasons[0].says
    assert any(mode.inside is False for mode in found.promised)
    stiffness = [one for one in found.found if one.unit == "N/m"]
    assert {one.name for one in stiffness} == {"vertical", "lateral"}
    for one in stiffness:
        assert one.drawn == DRAWN_N_PER_M
        assert one.low < 0.2 * DRAWN_N_PER_M < one.high


def test_what_the_pipe_runs_at_is_found_from_a_tap_in_another_state():
    """Tapped empty, running full: the true running frequencies lie in the intervals given."""
    _, truth, _ = booster()
    k = 0.2 * DRAWN_N_PER_M
    true_hz = np.array(frequencies(AddSupport(6.2, k, k).apply(truth), RUNNING))
    assert not answered(0.2).same_state
    measured = [mode for mode in answered(0.2).running if mode.measured_hz is not None]
    assert len(measured) >= 3
    for mode in measured:
        nearest = true_hz[np.argmin(np.abs(true_hz - mode.median_hz))]
        assert 0.99 * mode.low_hz < nearest < 1.01 * mode.high_hz


def test_a_change_of_which_nothing_shows_is_said_not_to():
    found = answered(0.0)
    assert found.ways[0][0] == NOTHING
    assert found.verdict == FAILED
    assert "rings as it did before" in found.reasons[0].says
    assert found.next_fixes is None


def test_probabilities_of_the_ways_add_up():
    for share in (1.0, 0.2, 0.0):
        assert sum(p for _, p in answered(share).ways) == pytest.approx(1.0)


def test_without_a_mode_it_says_what_to_measure():
    with pytest.raises(Refusal, match="no natural frequency") as refused:
        recheck(question(CHANGE, after=Evidence()))
    assert "three taps" in refused.value.measure_next


def test_an_absorber_is_another_kind_of_question():
    with pytest.raises(Refusal, match="absorber") as refused:
        recheck(question(CHANGE, change=AddAbsorber(6.2, 5.0, 1e5, 50.0)))
    assert "fieldkit running" in refused.value.measure_next


def test_too_few_parameter_sets_are_refused_with_what_to_tap():
    family = np.repeat(np.arange(3), 100)
    z = np.random.default_rng(4).standard_normal((3, 6))[family]
    with pytest.raises(Refusal, match="too few") as refused:
        _require_enough(Population(z, np.zeros(300), family, 5, 0.0))
    assert "other direction" in refused.value.measure_next


def tracked(medians_hz: np.ndarray, spread: float, seed: int) -> Tracked:
    rng = np.random.default_rng(seed)
    hz = medians_hz * (1 + spread * rng.standard_normal((200, len(medians_hz))))
    modes = Modes((2 * np.pi * hz) ** 2, np.zeros((200, len(medians_hz), len(medians_hz))))
    number = np.broadcast_to(np.arange(len(medians_hz)), hz.shape)
    share = np.tile([1.0, 0.0, 0.0], (len(medians_hz), 1))
    return Tracked(modes, hz, number, ("vertical",) * len(medians_hz), 0, share, share)


FREQUENCIES = st.lists(st.floats(5.0, 180.0), min_size=1, max_size=5)
PUMP = (Excitation("pump", (24.2, 24.9), (1.0, 2.0)),)


@given(FREQUENCIES, st.booleans(), st.integers(0, 99))
@settings(max_examples=60)
def test_what_is_measured_as_predicted_is_never_called_a_failure(hz, same_state, seed):
    """Where the promise keeps every mode clear with the margin of a predicted frequency."""
    goal = Goal()
    wide = bands(PUMP, goal.margin)
    medians = np.array(sorted(f for f in hz if not any(b.holds(f) for b in wide)))
    if not len(medians):
        return
    running = tracked(medians, 0.01, seed)
    tapped = tracked(medians if same_state else 1.2 * medians, 0.0, seed)
    tapped_hz = tapped.frequency_hz[0]
    measured = {i: MeasuredMode(float(f), 1e-3 * f, 0.01, 0.001) for i, f in enumerate(tapped_hz)}
    found = judged(Now(tapped, running, measured, (), same_state), PUMP, goal)
    assert verdict(found, goal)[0] != FAILED


def now_of(measured_hz: dict[int, float], medians: list[float], **more: object) -> Now:
    modes = {i: MeasuredMode(f, 0.05, 0.01, 0.001) for i, f in measured_hz.items()}
    both = tracked(np.array(medians), 0.01, 1)
    whole = Now(both, both, modes, (), True)
    return replace(whole, **more)  # type: ignore[arg-type]


def test_a_measured_mode_needs_the_margin_of_a_measured_one_only():
    """29.0 Hz is 16 % from 24.9 Hz: clear when measured, not when only predicted."""
    goal = Goal()
    assert verdict(judged(now_of({0: 29.0}, [29.0]), PUMP, goal), goal)[0] == WORKED
    said, because = verdict(judged(now_of({1: 80.0}, [29.0, 80.0]), PUMP, goal), goal)
    assert said == UNSURE
    assert "was not seen" in because


def test_a_measured_mode_in_a_band_is_a_failure():
    goal = Goal()
    said, because = verdict(judged(now_of({0: 49.0, 1: 80.0}, [49.0, 80.0]), PUMP, goal), goal)
    assert said == FAILED
    assert "49.0 Hz, inside pump 2x" in because


def test_a_stray_peak_beside_an_excitation_holds_success_back():
    goal = Goal()
    stray = (MeasuredMode(50.0, 0.05, 0.01, 0.001),)
    found = judged(now_of({0: 80.0}, [80.0], stray=stray), PUMP, goal)
    assert verdict(found, goal)[0] == UNSURE


def test_a_peak_that_fits_nothing_counts_for_another_mode():
    """Where the change stands as drawn and a peak is none of its modes."""
    told = reasons({AS_DRAWN: 0.9, STIFFNESS: 0.07, OTHER: 0.03}, 1.0, {}, "SI")
    assert told[0].name == OTHER
    assert told[0].probability == pytest.approx(0.93)
    assert all(reason.check for reason in told)


def test_a_stiffness_is_told_in_the_units_of_the_job():
    one = AsFound("vertical", "N/m", 4e6, 0.6e6, 0.8e6, 1.1e6, informed=True)
    (told,) = reasons({STIFFNESS: 1.0}, 0.0, {STIFFNESS: (one,)}, "US")
    assert "kip/in" in told.says
    assert "about 20 %" in told.says


def test_weighted_quantiles_are_those_of_the_weighted_values():
    rng = np.random.default_rng(3)
    value = rng.standard_normal(40_000)
    weight = np.exp(0.5 * value)
    low, median, high = weighted_quantiles(value, weight / weight.sum())
    assert (low, median, high) == pytest.approx((0.5 - 1.645, 0.5, 0.5 + 1.645), abs=0.05)


def test_success_is_not_built_on_a_loose_support():
    from fieldkit.detune.recheck import _as_it_stands

    assert _as_it_stands(WORKED, "clear", LOOSE)[0] == UNSURE
    assert _as_it_stands(WORKED, "clear", NOTHING)[0] == UNSURE
    assert _as_it_stands(WORKED, "clear", AS_DRAWN) == (WORKED, "clear")
    assert "not stand as drawn" in _as_it_stands(WORKED, "clear", STIFFNESS)[1]


def test_the_same_state_needs_no_conversion():
    """What was tapped as it runs counts as it is: within the doubt of a tap."""
    assert alike(RUNNING, RUNNING)
    found = judged(now_of({0: 40.0}, [44.0]), PUMP, Goal())
    assert found.modes[0].median_hz == pytest.approx(40.0, rel=1e-3)


def test_the_next_change_is_offered_on_the_pipe_as_found():
    """Ranked anew, and the support brought to what was drawn is judged like any other."""
    found = answered(0.2)
    assert found.next_fixes is not None
    assert found.next_fixes.fixes
    assert found.mended is not None
    assert "4.0 MN/m" in found.mended.summary
    assert found.mended.chance > 0.5
