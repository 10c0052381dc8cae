"""The promise bench counts what it says, and its exact plant is the pipe the model means."""

from __future__ import annotations

import json
from dataclasses import asdict

import numpy as np
import pytest

from fieldkit.detune.fixes import AddSupport
from fieldkit.span.modes import span_modes
from tests.bench.promises import aims
from tests.bench.promises.__main__ import read
from tests.bench.promises.calibration_plot import interval
from tests.bench.promises.exact import exact_modes
from tests.bench.promises.families import FAMILIES, described
from tests.bench.promises.report import reading_in, report
from tests.bench.promises.tally import Tally
from tests.bench.promises.taps import _merged, tapped
from tests.bench.promises.trial import NOMINAL, Trial, plans, run
from tests.bench.promises.truth import DISCREPANCY, LIKE, UNLIKE, hidden, installed


@pytest.mark.parametrize("family", FAMILIES)
def test_the_second_solver_agrees_with_the_span_model_on_the_hidden_pipe(family):
    """Both know every value; the mesh rule promises 0.1 %."""
    rng = np.random.default_rng(3)
    job = described(family, rng)
    truth = hidden(job, LIKE, rng)
    exact = [m.frequency_hz for m in exact_modes(truth.span, truth.running, job.up_to_hz)]
    model = [m.frequency_hz for m in span_modes(truth.span, truth.running, 1.1 * job.up_to_hz)]
    held = [f for f in model if f > 0.2]
    assert held[: len(exact)] == pytest.approx(exact, rel=1e-3)


def test_the_hidden_pipe_is_off_the_beam_by_a_per_cent_at_most_and_keeps_that_when_changed():
    rng = np.random.default_rng(5)
    job = described("double", rng)
    truth = hidden(job, LIKE, rng)
    modes = truth.tapped_modes(job.up_to_hz)
    off = np.array([m.frequency_hz / m.solved_hz - 1 for m in modes])
    assert 0 < np.std(off) < 3 * DISCREPANCY
    same = np.corrcoef(truth.tapped_error.ravel(), truth.running_error.ravel())[0, 1]
    assert same == pytest.approx(0.8, abs=0.15)


def test_plants_unlike_the_priors_have_other_supports_and_the_same_pipe():
    jobs = [described("double", np.random.default_rng(2)) for _ in range(2)]
    like, unlike = (
        hidden(job, way, np.random.default_rng(4))
        for job, way in zip(jobs, (LIKE, UNLIKE), strict=True)
    )
    assert like.span.supports[1].vertical != unlike.span.supports[1].vertical


def test_a_support_is_built_a_little_off_in_place_and_stiffness():
    rng = np.random.default_rng(6)
    job = described("single", rng)
    truth = hidden(job, LIKE, rng)
    built = [installed(AddSupport(1.0, vertical_n_per_m=1e6), truth, job, rng) for _ in range(300)]
    stiffness = np.log([span.supports[-1].vertical / 1e6 for span in built])
    place = [span.supports[-1].at_m - truth.moved(1.0) for span in built]
    assert np.std(stiffness) == pytest.approx(0.35, rel=0.15)
    assert np.std(place) == pytest.approx(0.015, rel=0.15)


def test_some_modes_are_missed_and_some_peaks_are_none():
    """Over thirty days of taps."""
    job = described("several", np.random.default_rng(8))
    truth = hidden(job, LIKE, np.random.default_rng(9))
    modes = truth.tapped_modes(job.up_to_hz)
    days = [tapped(job, truth, np.random.default_rng(day)) for day in range(30)]
    strays = [
        min(abs(p.frequency_hz / m.frequency_hz - 1) for m in modes) > 0.01
        for day in days
        for p in day.modes
    ]
    assert 0 < np.mean(strays) < 0.12
    shown = np.mean(
        [len({p.frequency_hz for p in d.modes if p.direction != "axial"}) for d in days]
    )
    assert shown < 2 * len(modes)


def test_peaks_closer_than_the_estimator_can_tell_apart_become_one():
    assert _merged(np.array([10.0, 10.1, 12.0])) == [10.05, 12.0]


def test_every_way_answers_the_same_spans():
    planned = plans((LIKE, UNLIKE), 10, 3)
    assert [p.seed for p in planned if p.way == LIKE] == [
        p.seed for p in planned if p.way == UNLIKE
    ]
    assert {p.family for p in planned} == set(FAMILIES)


def test_what_is_promised_and_kept_is_counted_over_first_changes():
    trials = [
        Trial("single", LIKE, 1, 3, promised=0.95, kept=True),
        Trial("single", LIKE, 2, 3, promised=0.92, kept=False),
        Trial("single", LIKE, 3, 3, promised=0.5, kept=True),
        Trial("single", LIKE, 4, 3),
        Trial("single", LIKE, 5, 0, refused="nothing was measured"),
    ]
    tally = Tally(trials)
    assert tally.offered_share == pytest.approx(0.4)
    assert tally.kept_of_offered == pytest.approx(0.5)
    assert tally.mean_promise == pytest.approx(0.79)
    assert tally.between(0.4, 0.6) == ([0.5], [True])
    assert tally.refused == 1


def test_the_interval_of_a_share_holds_it_and_narrows_with_the_number():
    few, many = interval([True] * 4 + [False]), interval([True] * 80 + [False] * 20)
    assert few[1] < 0.8 < few[2]
    assert many[2] - many[1] < few[2] - few[1]


def test_promises_are_kept_on_a_few_spans():
    """Fourteen spans of a fixed seed, the bounds from docs/promises.md.

    There nine in ten of the promises of 0.9 or more are kept, and about 84 % of the intervals hold,
    the two of a span mostly together. So few spans may fall short of that by chance: below four in
    five kept, or 65 % of the intervals, they fall in one draw of fifty. The usual ways fare worse.
    """
    few = [p for p in plans((LIKE,), 18, 21) if p.family != "several"]
    tally = Tally([run(plan) for plan in few])
    assert tally.refused == 0
    assert len(tally.offered) >= 8
    assert tally.kept_of_offered >= 0.8
    assert abs(tally.mean_promise - tally.mean_kept) < 0.2
    assert tally.coverage >= 0.65
    assert np.mean(tally.usual(NOMINAL)) < tally.mean_kept - 0.3


def test_an_aim_is_missed_only_where_chance_cannot_explain_it():
    """Of promises of 0.95: 97 of 100 kept reach the aim, 18 of 20 may be chance, 60 of 100 not."""

    def verdict(kept: int, of: int) -> str:
        trials = [
            Trial("single", LIKE, i, 3, promised=0.95, kept=i < kept, kind="support")
            for i in range(of)
        ]
        rows = {row[0]: row[-1] for row in aims.table(trials, LIKE)}
        return rows["kept of those promised 0.9 or more"]

    assert [verdict(97, 100), verdict(18, 20), verdict(60, 100)] == ["yes", "undecided", "no"]


def test_what_was_answered_once_is_read_again(tmp_path):
    trial = Trial("single", LIKE, 1, 3, promised=0.95, kept=True, covered=(True, False))
    path = tmp_path / "each.jsonl"
    assert read(path) == []
    path.write_text(json.dumps(asdict(trial)) + "\n", "utf-8")
    (again,) = read(path)
    assert Tally([again]).coverage == Tally([trial]).coverage
    assert (again.family, again.way, again.seed) == ("single", LIKE, 1)


def test_the_page_names_every_family_and_way():
    trials = [
        Trial("single", way, 1, 3, promised=0.95, kept=True, covered=(True,), error=(0.01,))
        for way in (LIKE, UNLIKE)
    ]
    page = report(trials, 7, 2, "Read me.\n")
    assert reading_in(page) == "Read me.\n"
    assert all(f"| {family} |" in page for family in FAMILIES)
    assert f"Truth {LIKE}" in page
    assert f"Truth {UNLIKE}" in page
    assert "| 0.8 to 1 | 1 | 0.95 | 1.00 | -0.05 |" in page
