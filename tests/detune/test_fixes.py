"""Changes as values: what they do to a span, and how they read as JSON and in words."""

from __future__ import annotations

import pytest

from fieldkit.detune.fixes import (
    AddMass,
    AddSupport,
    MoveMass,
    MoveSupport,
    SetMass,
    StiffenSupport,
)
from fieldkit.detune.wording import summary
from fieldkit.span.supports import springs
from tests.detune.lines import straight

CASES = [
    (
        AddSupport(2.05, vertical_n_per_m=4e6, lateral_n_per_m=4e6),
        {"add_support": {"at_m": 2.05, "vertical_n_per_m": 4e6, "lateral_n_per_m": 4e6}},
        "add a support at 2.05 m: 4.0 MN/m vertical and lateral",
    ),
    (
        MoveSupport(1, 5.0),
        {"move_support": {"index": 1, "to_m": 5.0}},
        "move the clamp at 4.10 m to 5.00 m",
    ),
    (
        StiffenSupport(1, lateral_n_per_m=3e7),
        {"stiffen_support": {"index": 1, "lateral_n_per_m": 3e7}},
        "stiffen the clamp at 4.10 m to 30 MN/m lateral in all",
    ),
    (AddMass(3.0, 12.0), {"add_mass": {"at_m": 3.0, "mass_kg": 12.0}}, "clamp 12 kg on at 3.00 m"),
    (
        SetMass(0, 0.0),
        {"set_mass": {"index": 0, "mass_kg": 0.0}},
        "take out the check valve (24 kg)",
    ),
    (
        MoveMass(0, 1.0),
        {"move_mass": {"index": 0, "to_m": 1.0}},
        "move the check valve from 2.60 m to 1.00 m",
    ),
]


@pytest.mark.parametrize(("change", "document", "words"), CASES)
def test_each_change_reads_as_the_contract_says(change, document, words):
    assert change.as_json() == document
    assert summary(change, straight(), "SI") == words


def test_an_added_support_restrains_only_what_it_states():
    changed = AddSupport(2.0, lateral_n_per_m=1e6).apply(straight())
    added = [s for s in springs(changed) if s.support == 3]
    assert [(s.axis, s.stiffness, s.sd_ln) for s in added] == [("lateral", 1e6, 0.0)]


def test_changes_leave_the_original_alone():
    span = straight()
    assert SetMass(0, 5.0).apply(span).masses[0].mass_kg == 5.0
    assert MoveSupport(1, 5.0).apply(span).supports[1].at_m == 5.0
    assert MoveMass(0, 1.0).apply(span).masses[0].at_m == 1.0
    assert AddMass(3.0, 12.0).apply(span).masses[1].mass_kg == 12.0
    assert span == straight()


def test_stiffening_states_the_new_total_and_keeps_the_rest():
    stiffened = StiffenSupport(1, vertical_n_per_m=5e7).apply(straight()).supports[1]
    assert stiffened.vertical == 5e7
    assert stiffened.lateral == "implied"
