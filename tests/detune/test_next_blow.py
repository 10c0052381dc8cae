"""The next blow is the one that narrows the answer, by the arithmetic of a normal ensemble."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np
import pytest

from fieldkit.detune.carried_over import carried, clearance, frequencies_after
from fieldkit.detune.evidence import Evidence
from fieldkit.detune.excitation import Band
from fieldkit.detune.field import field
from fieldkit.detune.fixes import AddMass, AddSupport
from fieldkit.detune.likelihood import MODEL_ERROR
from fieldkit.detune.next_blow import (
    READING_ERROR,
    Matters,
    next_blows,
    sentence,
    settled,
    variance_left,
)
from fieldkit.detune.reduced import build
from fieldkit.detune.unknowns import member_span, station_map, unknowns_of
from fieldkit.detune.visible import follow_modes
from fieldkit.span.modes import span_modes
from tests.detune.lines import RUNNING, TAPPED, UP_TO_HZ, evidence_of, hidden, matched, straight

NOISE = MODEL_ERROR**2 + READING_ERROR**2


def draws(count, seed=1):
    return np.random.default_rng(seed).standard_normal((40_000, count))


def test_a_mode_seen_for_certain_leaves_the_variance_of_a_linear_update():
    """t = y, var s^2: s^2 R / (s^2 + R) is left (closed form)."""
    y = 0.02 * draws(1)
    expected = 0.02**2 * NOISE / (0.02**2 + NOISE)
    assert variance_left(y, y, np.array([1.0]))[0] == pytest.approx(expected, rel=0.02)


def test_a_mode_that_may_not_show_gains_in_proportion():
    """The mean over showing and not showing."""
    y = 0.02 * draws(1)
    whole, half, none = (float(variance_left(y, y, np.array([c]))[0]) for c in (1.0, 0.5, 0.0))
    assert half == pytest.approx(0.5 * (whole + none), rel=1e-6)
    assert none == pytest.approx(y.var(), rel=1e-6)


def test_what_is_not_correlated_learns_nothing():
    both = 0.02 * draws(2)
    left = variance_left(both[:, :1], both[:, 1:], np.array([1.0]))[0]
    assert left == pytest.approx(both[:, 0].var(), rel=1e-3)


def test_two_modes_leave_what_regression_on_both_leaves():
    """numpy's least squares on noisy observations is the reference."""
    base = 0.02 * draws(3)
    target = base @ np.array([[1.0], [0.5], [0.2]])
    seen = base[:, :2]
    noisy = seen + np.sqrt(NOISE) * draws(2, seed=9)
    fitted = noisy @ np.linalg.lstsq(noisy, target, rcond=None)[0]
    left = variance_left(target, seen, np.array([1.0, 1.0]))[0]
    assert left == pytest.approx((target - fitted).var(), rel=0.02)


@pytest.mark.parametrize("mean", [-0.02, 0.0, 0.01, 0.05])
def test_the_chance_to_settle_agrees_with_trying_it(mean):
    """Clearances drawn, measured with noise, and judged after the measurement."""
    sd, noise = 0.03, 0.02
    after = sd**2 * noise**2 / (sd**2 + noise**2)
    truth = mean + sd * draws(1)[:, 0]
    seen = truth + noise * draws(1, seed=2)[:, 0]
    believed = mean + sd**2 / (sd**2 + noise**2) * (seen - mean)
    sure = np.mean(np.abs(believed) >= 1.2815516 * np.sqrt(after))
    assert settled(mean, sd**2, after) == pytest.approx(sure, abs=0.01)


@cache
def vertical_only():
    """The booster line tapped in one direction only, and its match."""
    span = straight()
    truth = hidden(span, 5)
    whole = evidence_of(truth, 6)
    known = Evidence(tuple(m for m in whole.modes if m.direction == "vertical"))
    return span, truth, matched(span, known)


@cache
def watched():
    span, _, found = vertical_only()
    unknowns = unknowns_of(span, (TAPPED, RUNNING))
    return {
        state.name: follow_modes(
            field(span, build(span, state, unknowns, UP_TO_HZ), found.ensemble.standard), UP_TO_HZ
        )
        for state in (TAPPED, RUNNING)
    }


def blows(states=("tapped", "running"), reach=True):
    _, _, found = vertical_only()
    matters = Matters(np.log(watched()["running"].frequency_hz), "the running modes")
    seen = [("tapped", pair.mode) for pair in found.pairs]
    may = [reach] * len(watched()["tapped"].field.station_m)
    return next_blows([(s, watched()[s]) for s in states], seen, matters, may)


def test_after_vertical_taps_the_lateral_ones_come_first():
    """What was never struck is the least known."""
    assert blows(("tapped",))[0].direction == "lateral"
    best = blows()[0]
    assert best.direction == "lateral"
    assert 0 < best.sd_after < 0.6 * best.sd_before
    assert any(mode.direction == "lateral" and mode.chance > 0.5 for mode in best.modes)


def test_the_blow_it_names_narrows_the_match_as_much_as_it_promised():
    """The hidden lateral modes are measured too: the doubt falls at least as far as expected.

    It falls farther, since stiffness acts on frequency as a straight line only for small doubts.
    """
    span, truth, _ = vertical_only()
    best = blows(("tapped",))[0]
    before = np.log(watched()["running"].frequency_hz).var(axis=0)
    assert best.sd_before == pytest.approx(np.sqrt(before.mean()))
    after = matched(span, evidence_of(truth, 6))
    model = build(span, RUNNING, unknowns_of(span, (TAPPED, RUNNING)), UP_TO_HZ)
    modes = follow_modes(field(span, model, after.ensemble.standard), UP_TO_HZ)
    left = np.sqrt(np.log(modes.frequency_hz).var(axis=0).mean())
    assert left < 1.1 * best.sd_after < best.sd_before


def test_nothing_is_advised_where_no_sensor_can_sit():
    assert blows(reach=False) == ()
    assert "add little" in sentence(())


def test_a_sensor_at_an_anchor_shows_nothing():
    """At station 0 the pipe does not move; in the middle of the long span it does."""
    modes = watched()["tapped"]
    middle = int(np.argmin(np.abs(modes.field.station_m - 6.2)))
    shown = modes.shown([0, middle], "vertical")
    first = modes.direction.index("vertical")
    assert shown[0, first] < 0.15
    assert shown[1, first] > 0.8


def test_the_sentence_names_place_direction_state_and_what_it_is_worth():
    text = sentence(blows())
    assert "lateral direction near" in text
    assert "expected to cut the doubt about the running modes from" in text


def test_members_carry_their_numbers_into_a_changed_span():
    """A heavier mass or a new support: one member re-solved in full is the reference."""
    span, _, found = vertical_only()
    states = (TAPPED, RUNNING)
    z = found.ensemble.standard[:3]
    unknowns = unknowns_of(span, states)
    moved = station_map(span, unknowns, z[0])
    for change in (AddSupport(6.2, vertical_n_per_m=4e6), AddMass(5.0, 20.0)):
        hz = frequencies_after(span, states, z, change, UP_TO_HZ)
        there = replace(change, at_m=moved(change.at_m))
        member = there.apply(member_span(span, unknowns, z[0]))
        exact = [m.frequency_hz for m in span_modes(member, RUNNING, 60.0)]
        quick = hz[0][hz[0] > 0.2][: len(exact)]
        assert quick == pytest.approx(exact, rel=0.02)


def test_a_part_of_a_stretch_keeps_the_length_error_of_its_whole():
    span = straight()
    changed = AddSupport(6.2, vertical_n_per_m=4e6).apply(span)
    before, after = (unknowns_of(s, (TAPPED, RUNNING)) for s in (span, changed))
    z = np.arange(1.0, len(before) + 1)[None]
    found = carried(span, changed, before, after, z)[0]
    lengths = [found[i] for i, u in enumerate(after) if u.role == "length"]
    whole = [z[0, i] for i, u in enumerate(before) if u.role == "length"]
    assert lengths == [whole[0], whole[1], whole[1]]


def test_clearance_is_the_distance_to_the_nearest_edge_of_the_worst_mode():
    """In ln: 44 Hz outside [20, 40] by ln 1.1; 30 Hz inside by ln(40 / 30)."""
    band = Band("pump", 25, 33, 20.0, 40.0)
    hz = np.array([[0.0, 44.0, 90.0], [0.0, 30.0, 90.0], [0.0, 44.0, 300.0]])
    assert clearance(hz, [band], 100.0) == pytest.approx(
        [np.log(1.1), -np.log(40 / 30), np.log(1.1)]
    )
