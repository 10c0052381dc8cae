"""Counting at band edges against solving."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from fieldkit.detune import judge
from fieldkit.detune.candidates import FAMILIES, Search, generate
from fieldkit.detune.excitation import Goal, bands
from fieldkit.detune.field import field
from fieldkit.detune.reduced import build
from fieldkit.detune.screen import as_installed, counter, negative_count
from fieldkit.detune.unknowns import unknowns_of
from fieldkit.progress import Progress
from tests.detune.lines import RUNNING, TAPPED, UP_TO_HZ, riser, shaken, straight


@given(arrays(float, (3, 4, 4), elements=st.floats(-5, 5)))
@settings(max_examples=60)
def test_pivot_signs_count_negative_eigenvalues(square):
    symmetric = square + np.swapaxes(square, 1, 2) + 0.01 * np.diag([1.0, -2.0, 3.0, -4.0])
    eigenvalue = np.linalg.eigvalsh(symmetric)
    pivots = [np.linalg.det(symmetric[:, :k, :k]) for k in range(1, 5)]
    settled = np.all(np.abs(pivots) > 1e-6, axis=0) & np.all(np.abs(eigenvalue) > 1e-6, axis=1)
    expected = (eigenvalue < 0).sum(axis=1)
    assert list(negative_count(symmetric)[settled]) == list(expected[settled])


def searching(span, frequency_hz):
    unknowns = unknowns_of(span, (TAPPED, RUNNING))
    model = build(span, RUNNING, unknowns, UP_TO_HZ)
    z = 0.5 * np.random.default_rng(4).standard_normal((24, len(unknowns)))
    goal = Goal(up_to_hz=UP_TO_HZ)
    forbidden = bands(shaken(frequency_hz), goal.margin)
    scatter = as_installed(24, np.random.default_rng(5))
    return Search(span, field(span, model, z), forbidden, goal, scatter)


@pytest.mark.parametrize(("span", "frequency_hz"), [(straight(), 14.0), (riser(), 20.0)])
def test_counted_chances_equal_solved_ones(span, frequency_hz):
    """Every family, a sample of its candidates: the same members are clear either way."""
    search = searching(span, frequency_hz)
    rng = np.random.default_rng(6)
    for name, family in FAMILIES.items():
        found = list(family(search))
        assert found, name
        for i in rng.choice(len(found), size=min(12, len(found)), replace=False):
            spectrum = judge.after(search.field, search.push(found[i].change), UP_TO_HZ)
            solved = judge.chance_clear(spectrum, search.bands, UP_TO_HZ)
            assert found[i].chance == pytest.approx(solved, abs=2.1 / 24), found[i].change


def test_nothing_is_attached_in_a_keep_out_or_when_not_allowed():
    search = searching(straight(), 14.0)
    goal = Goal(up_to_hz=UP_TO_HZ, allow=("support",), keep_out_m=((1.0, 3.0),))
    limited = Search(search.span, search.field, search.bands, goal, search.scatter)
    changes = [candidate.change for candidate in generate(limited, Progress())]
    assert changes
    assert {change.kind for change in changes} == {"support"}
    assert not any(1.0 <= change.at_m <= 3.0 for change in changes)


def test_a_span_without_modes_in_the_band_is_clear_as_it_is():
    search = searching(straight(), 0.5)
    assert counter(search.field, search.bands, UP_TO_HZ).clear_now().all()
