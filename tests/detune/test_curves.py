"""Curves of a change: each value is that change judged, and what makes no sense is said."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from fieldkit.detune.curves import KINDS, FixCurve, curves_of, fix_curve, varied
from fieldkit.detune.fixes import (
    AddMass,
    AddSupport,
    AllOf,
    ChangeSpeed,
    MoveMass,
    MoveSupport,
    SetMass,
    StiffenSupport,
)
from fieldkit.detune.rank import judged_change
from fieldkit.errors import InputError
from tests.detune.lines import RUNNING, TAPPED
from tests.detune.test_chance_map import searching

ADDED = AddSupport(2.5, 4e6, 4e6)
STEPS = 7


@cache
def curve(change, kind, name="riser") -> FixCurve:
    return fix_curve(searching(name), RUNNING, change, kind, steps=STEPS)


@pytest.mark.parametrize("kind", KINDS)
def test_the_drawn_value_promises_what_the_ranking_does(kind):
    """The same change judged by the ranking: the same chance and the same modes."""
    found = curve(ADDED, kind)
    ranked = judged_change(searching("riser"), TAPPED, RUNNING, ADDED)
    drawn = found.varied.drawn
    assert found.varied.changes[drawn] == ADDED
    assert found.chance[drawn] == pytest.approx(ranked.chance)
    assert found.modes[drawn] == ranked.modes_after


@pytest.mark.parametrize("i", [0, 3, 6])
def test_any_other_value_promises_what_the_ranking_would(i):
    found = curve(ADDED, "stiffness")
    ranked = judged_change(searching("riser"), TAPPED, RUNNING, found.varied.changes[i])
    assert found.chance[i] == pytest.approx(ranked.chance)
    assert found.modes[i] == ranked.modes_after


def test_stiffer_never_lowers_a_frequency():
    """Courant's principle: added stiffness raises every natural frequency or leaves it."""
    median = curve(ADDED, "stiffness").frequency_hz[:, :3, 1]
    assert (np.diff(median, axis=0) > -0.01 * median[1:]).all()


def test_heavier_never_raises_a_frequency():
    """Added mass lowers every natural frequency or leaves it."""
    median = curve(AddMass(3.1, 12.0), "mass").frequency_hz[:, :3, 1]
    assert (np.diff(median, axis=0) < 0.01 * median[1:]).all()


def test_the_band_of_the_ensemble_holds_its_median():
    low, median, high = np.moveaxis(curve(ADDED, "place").frequency_hz, 2, 0)
    known = np.isfinite(median)
    assert (low[known] <= median[known]).all()
    assert (median[known] <= high[known]).all()


def test_stretches_that_keep_the_chance_end_on_values_that_do():
    found = curve(ADDED, "place")
    for low, high in found.kept:
        inside = (found.varied.value >= low) & (found.varied.value <= high)
        assert (found.chance[inside] >= found.wanted).all()
    assert found.kept_out.tolist() == [1.0 <= x <= 1.4 for x in found.varied.value]


@pytest.mark.parametrize(
    ("change", "sizes"),
    [
        (ADDED, KINDS),
        (MoveSupport(1, 2.0), ("place", "mass")),
        (StiffenSupport(1, lateral_n_per_m=2e7), ("stiffness", "mass")),
        (StiffenSupport(1, rotation_n_m_per_rad=1e6), ("mass",)),
        (AddMass(3.0, 10.0), ("place", "mass")),
        (MoveMass(0, 3.0), ("place",)),
        (SetMass(0, 4.0), ("mass",)),
        (ChangeSpeed("fan", 12.0, 12.5), ()),
        (AllOf((SetMass(0, 4.0), ADDED)), KINDS),
    ],
)
def test_a_change_has_the_sizes_that_make_sense(change, sizes):
    assert curves_of(searching("riser"), change) == sizes


def test_a_curve_without_sense_is_refused_with_what_has():
    with pytest.raises(InputError, match=r"sets no stiffness.*ask for place or mass"):
        varied(searching("riser"), MoveSupport(1, 2.0), "stiffness")
    with pytest.raises(InputError, match="choose a change of the pipe itself"):
        varied(searching("riser"), ChangeSpeed("fan", 12.0, 12.5), "place")


def test_of_two_changes_one_is_moved_and_the_other_stays():
    pair = AllOf((StiffenSupport(1, lateral_n_per_m=2e7), ADDED))
    own = varied(searching("riser"), pair, "place", STEPS)
    assert {change.parts[0] for change in own.changes} == {pair.parts[0]}
    assert own.changes[own.drawn] == pair
    assert "part 2" in own.what


def test_a_moved_support_stays_between_its_neighbours():
    own = varied(searching("riser"), MoveSupport(1, 2.0), "place")
    supports = [support.at_m for support in searching("riser").span.supports]
    assert supports[0] < own.value[0]
    assert own.value[-1] < supports[2]
    assert own.value[own.drawn] == 2.0


def test_a_drawn_value_beyond_the_usual_is_on_the_curve_all_the_same():
    own = varied(searching("riser"), AddSupport(2.5, vertical_n_per_m=1e9), "stiffness", STEPS)
    assert own.value[own.drawn] == 1e9
    assert (np.diff(own.value) > 0).all()
