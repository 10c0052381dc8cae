"""From samples to modes on recordings of every kind: floors, looser than what the bench measures.

``python -m tests.bench.accuracy`` measures the same on as many recordings as one likes.
"""

from __future__ import annotations

import pytest

from tests.bench.accuracy.kinds import KINDS, scene_of
from tests.bench.accuracy.tally import Tally
from tests.bench.accuracy.trial import Plan, run

pytestmark = pytest.mark.timeout(1200)

WAY = "samples alone"
MOST_SAMPLES = 90_000
EACH = 2
OF_INTEREST = {"pair": 3, "hum": 3, "doubles": 3, "clipped": 3}
"""Kinds of which more are looked at."""


def short_ones(kind: str) -> list[int]:
    """The first seeds of a kind whose recordings are short enough to be quick."""
    seeds: list[int] = []
    seed = 0
    while len(seeds) < OF_INTEREST.get(kind, EACH):
        scene, _ = scene_of(kind, seed)
        seeds += [seed] if scene.duration_s * scene.rate_hz < MOST_SAMPLES else []
        seed += 1
    return seeds


@pytest.fixture(scope="module")
def tally() -> Tally:
    plans = [Plan(kind, seed, (WAY,)) for kind in KINDS for seed in short_ones(kind)]
    return Tally(tuple(run(plan).scores[WAY] for plan in plans))


def test_no_recording_breaks_the_estimator(tally: Tally) -> None:
    assert not [score.crash for score in tally.scores if score.crash]


@pytest.mark.parametrize(("kind", "seed"), [("many", 3100003), ("pair", 2100006)])
def test_a_pole_that_would_leave_the_region_stays_inside_and_hides_no_mode(
    kind: str, seed: int
) -> None:
    score = run(Plan(kind, seed, (WAY,))).scores[WAY]
    assert not score.crash
    assert len(score.found) >= score.estimable - 1
    assert not score.false_hz


def test_nearly_all_estimable_modes_are_found(tally: Tally) -> None:
    assert tally.sum(lambda s: s.estimable) > 60
    assert tally.share(lambda s: len(s.found), lambda s: s.estimable) >= 0.93


def test_hardly_a_false_mode_and_none_at_mains_or_without_structure(tally: Tally) -> None:
    assert tally.sum(lambda s: len(s.false_hz)) <= 2
    assert tally.sum(lambda s: len(s.false_at_mains_hz)) == 0
    assert sum(len(s.false_hz) for s in tally.scores if not s.estimable) == 0


def test_errors_are_near_the_bound(tally: Tally) -> None:
    assert tally.frequency_ratio < 1.4
    assert tally.damping_ratio < 1.5


def test_stated_intervals_hold_the_truth(tally: Tally) -> None:
    assert tally.frequency_coverage >= 0.88
    assert tally.damping_coverage >= 0.88


def test_frequency_is_far_nearer_the_truth_than_a_picked_peak(tally: Tally) -> None:
    assert tally.picked_frequency_error > 8 * tally.frequency_error
    assert tally.picked_damping_error > 3 * tally.damping_error


def test_double_and_clipped_blows_are_told(tally: Tally) -> None:
    assert tally.share(lambda s: s.doubles_told, lambda s: s.doubles) >= 0.8
    assert tally.share(lambda s: s.clipped_told, lambda s: s.clipped) >= 0.95
    assert tally.share(lambda s: s.good_taps_used, lambda s: s.good_taps) >= 0.85
