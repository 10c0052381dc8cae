"""What peaks of two states say together."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from fieldkit.detune.peak_groups import grouped, seen_by
from fieldkit.detune.problem import Problem, log_likelihood
from fieldkit.detune.reduced import build, same_mesh
from fieldkit.detune.unknowns import unknowns_of
from tests.detune.lines import RUNNING, TAPPED, UP_TO_HZ, booster, evidence_of


@pytest.fixture(scope="module")
def both_states():
    """The empty and the full booster line with the same peaks in either, and a few members."""
    span, truth, _ = booster()
    unknowns = unknowns_of(span, (TAPPED, RUNNING))
    models = tuple(build(span, state, unknowns, UP_TO_HZ) for state in (TAPPED, RUNNING))
    modes = evidence_of(truth, 6).modes
    every = [replace(m, state=state.name) for state in (TAPPED, RUNNING) for m in modes]
    groups = grouped(every, UP_TO_HZ)
    number = {TAPPED.name: 0, RUNNING.name: 1}
    seen = tuple(seen_by(span, models, number[g.peaks.state], g) for g in groups)
    assert same_mesh(models)
    z = np.random.default_rng(3).standard_normal((60, len(unknowns)))
    return Problem(models, seen), z


def test_modes_sought_among_those_of_the_other_state_are_those_of_the_state(both_states):
    """Empty to full moves frequencies by a third; the shapes carry over to 0.1 %, worst 0.5 %."""
    problem, z = both_states
    own = problem.modes(z)[1].frequency_hz
    carried = replace(problem, alike=True).modes(z)[1].frequency_hz
    looked_at = own < UP_TO_HZ
    off = np.abs(carried / own[:, : carried.shape[1]] - 1)[looked_at[:, : carried.shape[1]]]
    assert np.quantile(off, 0.95) < 1e-3
    assert off.max() < 5e-3


def test_they_explain_the_peaks_as_well(both_states):
    problem, z = both_states
    own, carried = log_likelihood(problem, z), log_likelihood(replace(problem, alike=True), z)
    near = own > own.max() - 30
    assert carried[near] == pytest.approx(own[near], abs=0.5)
