"""How soon the match and the ranking notice that the user wants to stop."""

from __future__ import annotations

import pytest

from fieldkit.detune.excitation import Goal
from fieldkit.detune.match import match
from fieldkit.detune.rank import detune
from fieldkit.detune.reduced import ReducedModel
from fieldkit.errors import Cancelled
from fieldkit.progress import Progress
from tests.detune.lines import RUNNING, TAPPED, UP_TO_HZ, booster, evidence_of, shaken

MOST_MEMBERS = 900
"""Solved between two looks at the stop flag: a long line takes about 0.15 ms each."""


class Looks:
    """A stop flag that counts looks and the most members solved between two of them."""

    def __init__(self, monkeypatch, stop_at=None):
        self.looks, self.members, self.most = 0, 0, 0
        self.stop_at = stop_at
        modes = ReducedModel.modes

        def counting(model, z):
            self.members += len(z)
            self.most = max(self.most, self.members)
            return modes(model, z)

        monkeypatch.setattr(ReducedModel, "modes", counting)

    def __call__(self):
        self.members = 0
        self.looks += 1
        return self.looks == self.stop_at


def test_the_match_looks_at_the_stop_flag_before_every_few_hundred_members(monkeypatch):
    span, truth, _ = booster()
    looks = Looks(monkeypatch)
    evidence = evidence_of(truth, 6)
    match(span, TAPPED, RUNNING, evidence, up_to_hz=UP_TO_HZ, progress=Progress(stop=looks))
    assert 0 < looks.most <= MOST_MEMBERS


def test_the_ranking_looks_at_the_stop_flag_while_it_tries_changes(monkeypatch):
    """A goal no change reaches, so that pairs are tried too."""
    span, _, found = booster()
    looks, said = Looks(monkeypatch), []
    progress = Progress(lambda text, _: said.append(text), looks)
    goal = Goal(up_to_hz=UP_TO_HZ, chance=0.9999)
    answer = detune(span, TAPPED, RUNNING, found, shaken(15.0), goal, progress=progress)
    assert 0 < looks.most <= MOST_MEMBERS
    assert said.count("trying changes: support") > answer.tried / 500
    assert said.count("trying pairs of changes") > 30


@pytest.mark.parametrize("stop_at", [1, 5, 20])
def test_a_stop_ends_the_match_at_once(monkeypatch, stop_at):
    span, truth, _ = booster()
    looks = Looks(monkeypatch, stop_at)
    evidence = evidence_of(truth, 6)
    with pytest.raises(Cancelled):
        match(span, TAPPED, RUNNING, evidence, up_to_hz=UP_TO_HZ, progress=Progress(stop=looks))
    assert looks.looks == stop_at
