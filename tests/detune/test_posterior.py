"""The sampler draws what it should, and knows how much its draws are worth."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from fieldkit.detune.laplace import Mixture, Normals, mixture
from fieldkit.detune.match import _require_enough
from fieldkit.detune.posterior import MEMBERS, Population, effective_size, pooled
from fieldkit.errors import Refusal
from tests.detune.lines import booster


def test_independent_members_are_worth_their_number():
    values = np.random.default_rng(1).standard_normal((400, 12))
    assert effective_size(values, np.arange(400)) > 300


def test_copies_of_a_few_draws_are_worth_those_few():
    """Twenty draws copied twenty times, each copy hardly moved."""
    rng = np.random.default_rng(2)
    family = np.repeat(np.arange(20), 20)
    values = rng.standard_normal((20, 12))[family] + 0.01 * rng.standard_normal((400, 12))
    assert effective_size(values, family) == pytest.approx(20, rel=0.4)


def test_copies_that_moved_apart_count_as_new():
    """Whatever their ancestry."""
    values = np.random.default_rng(3).standard_normal((400, 12))
    assert effective_size(values, np.repeat(np.arange(20), 20)) > 200


def test_an_ensemble_of_very_few_unlike_members_is_refused():
    family = np.repeat(np.arange(3), 100)
    z = np.random.default_rng(4).standard_normal((3, 6))[family]
    population = Population(z, np.zeros(300), family, 5, 0.0)
    with pytest.raises(Refusal, match="independent parameter sets only") as refused:
        _require_enough(population)
    assert "tap another place" in refused.value.measure_next


def test_two_populations_are_pooled_by_their_evidence():
    """One three times as likely as the other gives three quarters; families stay apart."""

    def population(at: float, log_evidence: float) -> Population:
        z = np.full((MEMBERS, 2), at)
        return Population(z, np.zeros(MEMBERS), np.arange(MEMBERS), 2, 0.2, log_evidence)

    first, second = population(0.0, -7.0 + np.log(3)), population(1.0, -7.0)
    both = pooled(first, second, np.random.default_rng(6))
    assert len(both.z) == MEMBERS
    assert np.mean(both.z[:, 0]) == pytest.approx(0.25)
    assert len(np.unique(both.family)) == MEMBERS
    assert both.log_evidence == pytest.approx(-7.0 + np.log(4))


def _two_hills() -> Mixture:
    factor = np.linalg.cholesky(np.array([[[0.3, 0.1], [0.1, 0.2]], [[0.1, 0.0], [0.0, 1.0]]]))
    return Mixture(np.array([0.7, 0.3]), np.array([[0.0, 0.0], [3.0, 1.0]]), factor)


def test_renewal_leaves_the_mixture_as_it_is():
    """Means and spreads of 20,000 draws before and after, within four standard errors."""
    hills, rng = _two_hills(), np.random.default_rng(5)
    z = hills.draw(20_000, rng)
    moved = hills.renewed(z, rng.choice([0.3, 0.8, 1.0], size=len(z)), rng)
    assert not np.allclose(moved, z)
    assert moved.mean(axis=0) == pytest.approx(z.mean(axis=0), abs=4 * 1.5 / 141)
    assert moved.std(axis=0) == pytest.approx(z.std(axis=0), rel=0.03)


def test_the_density_of_a_mixture_integrates_to_one():
    hills = _two_hills()
    x, y = np.meshgrid(np.linspace(-5, 8, 300), np.linspace(-6, 8, 300), indexing="ij")
    density = np.exp(hills.log_density(np.stack([x.ravel(), y.ravel()], axis=1)))
    assert density.sum() * (13 / 299) * (14 / 299) == pytest.approx(1.0, rel=1e-3)


def test_a_normal_is_widened_only_where_the_peaks_speak():
    covariance = np.diag([0.01, 1.0])[None]
    made = mixture(Normals(np.zeros((1, 2)), covariance, np.zeros(1)))
    widened = made.factor[0] @ made.factor[0].T
    assert widened[0, 0] == pytest.approx(0.01 * 1.3**2, rel=0.01)
    assert widened[1, 1] == pytest.approx(1.0)


def test_a_match_keeps_as_many_members_to_judge_by_as_to_choose_by():
    _, _, found = booster()
    ensemble = found.ensemble
    assert ensemble.fresh is not None
    assert len(ensemble.standard) == len(ensemble.fresh) >= 200
    assert not set(map(tuple, ensemble.standard)) & set(map(tuple, ensemble.fresh))
    assert 30 < ensemble.effective_size <= 400
    assert replace(ensemble, independent=None).effective_size == pytest.approx(200)


def test_one_family_proves_little_however_far_it_spread():
    """All members from one draw, or all but two: the rest of the posterior may be missing."""
    values = np.random.default_rng(6).standard_normal((400, 12))
    assert effective_size(values, np.zeros(400, dtype=int)) <= 12
    assert effective_size(values, np.array([0] * 398 + [1, 2])) <= 13
