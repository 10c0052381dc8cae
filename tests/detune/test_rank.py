"""Ranked changes: they keep their promise on the hidden truth, and say what they cost."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.detune.effort import effort
from fieldkit.detune.excitation import Excitation, Goal, clear_of_all
from fieldkit.detune.fixes import AddMass, AddSupport, StiffenSupport
from fieldkit.detune.rank import detune
from fieldkit.errors import Cancelled, InputError
from fieldkit.progress import Progress
from fieldkit.span.layout import State
from fieldkit.span.modes import span_modes
from tests.detune.lines import (
    RUNNING,
    TAPPED,
    UP_TO_HZ,
    booster,
    booster_answer,
    frequencies,
    shaken,
)

FULL = State("running", (1.0, 1.0))


def test_the_resonance_is_seen():
    _, answer = booster_answer()
    assert answer.chance_now < 0.1
    assert answer.modes[0].chance_clear < 0.1


def test_the_best_change_is_promised_and_kept():
    truth, answer = booster_answer()
    best = answer.fixes[0]
    assert best.chance >= 0.9
    after = frequencies(best.change.apply(truth), RUNNING)
    assert clear_of_all(np.array(after), answer.bands).all()


def test_shown_frequencies_are_those_of_the_changed_span():
    """Within 3 % of the hidden truth with the change made to it."""
    truth, answer = booster_answer()
    for fix in answer.fixes[:4]:
        after = frequencies(fix.change.apply(truth), RUNNING)
        shown = [mode.median_hz for mode in fix.modes_after][:4]
        assert sorted(shown) == pytest.approx(after[: len(shown)], rel=0.03)


def test_the_quick_model_agrees_with_the_full_re_solve():
    """Within 1 % for every mode up to the limit and every judged change of a line without heat."""
    span, truth, found = booster()
    lowest = span_modes(truth, FULL, UP_TO_HZ)[0].frequency_hz
    answer = detune(span, TAPPED, FULL, found, shaken(lowest), Goal(up_to_hz=UP_TO_HZ))
    assert not any("quick model missed" in text for text in answer.warnings)


def test_ranked_by_chance_then_by_size():
    span, _, _ = booster()
    _, answer = booster_answer()
    sure = [fix for fix in answer.fixes if fix.chance >= 0.985]
    sizes = [effort(fix.change, span) for fix in sure]
    assert sizes == sorted(sizes)
    assert [fix.rank for fix in answer.fixes] == list(range(1, len(answer.fixes) + 1))


def test_each_change_carries_its_cautions():
    _, answer = booster_answer()
    for fix in answer.fixes:
        assert any("local code" in caution for caution in fix.cautions)
    support = next(fix for fix in answer.fixes if isinstance(fix.change, AddSupport))
    assert any("at least" in caution for caution in support.cautions)


def test_where_nothing_helps_it_says_so():
    """Bands from end to end leave no room for any mode."""
    span, _, found = booster()
    everywhere = tuple(
        Excitation(f"source {i}", frequency_hz=(f, 1.3 * f))
        for i, f in enumerate((5, 9, 15, 26, 45))
    )
    goal = Goal(up_to_hz=70.0)
    answer = detune(span, TAPPED, RUNNING, found, everywhere, goal)
    assert all(fix.chance < 0.9 for fix in answer.fixes)
    assert any("no single change reaches" in text for text in answer.warnings)


def test_without_a_tap_the_chances_are_called_what_they_are():
    span, _, _ = booster()
    answer = detune(span, TAPPED, RUNNING, None, shaken(14.0), Goal(up_to_hz=UP_TO_HZ))
    assert any("nothing was measured" in text for text in answer.warnings)


def test_no_excitation_is_bad_input():
    span, _, found = booster()
    with pytest.raises(InputError, match="no excitation"):
        detune(span, TAPPED, RUNNING, found, (), Goal())


def test_it_stops_when_asked():
    span, _, found = booster()
    with pytest.raises(Cancelled):
        detune(
            span,
            TAPPED,
            RUNNING,
            found,
            shaken(14.0),
            Goal(up_to_hz=UP_TO_HZ),
            progress=Progress(stop=lambda: True),
        )


def test_a_stiffer_bracket_and_a_heavier_mass_are_bigger_changes():
    span, _, _ = booster()
    assert effort(AddSupport(2.0, 1e6), span) < effort(AddSupport(2.0, 1e7), span)
    assert effort(AddSupport(2.0, 1e6), span) < effort(AddSupport(2.0, 1e6, 1e6), span)
    assert effort(AddMass(2.0, 5.0), span) < effort(AddMass(2.0, 50.0), span)
    assert effort(StiffenSupport(1, 1e6), span) < effort(AddSupport(2.0, 1e6), span)


def test_steel_nearby_makes_a_bracket_less_work_and_a_mass_not():
    span, _, _ = booster()
    goal = Goal(steel_m=((1.5, 2.5),))
    assert effort(AddSupport(2.0, 1e6), span, goal) < effort(AddSupport(2.0, 1e6), span)
    assert effort(AddSupport(3.0, 1e6), span, goal) == effort(AddSupport(3.0, 1e6), span)
    assert effort(AddMass(2.0, 5.0), span, goal) == effort(AddMass(2.0, 5.0), span)
