"""The joint unknowns of a span before and after a change mean the same pipe on both sides."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

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
from fieldkit.detune.recheck_change import difference
from fieldkit.detune.recheck_joint import believed, embedded, joint_of, lifted, lowered
from fieldkit.detune.recheck_spans import (
    AS_DRAWN,
    LOOSE,
    MASS,
    NOTHING,
    PLACE,
    STIFFNESS,
    installed,
    marked,
    pinned,
    stations_of,
    ways,
)
from fieldkit.detune.reduced import build
from fieldkit.detune.unknowns import unknowns_of
from fieldkit.errors import InputError
from fieldkit.span.layout import Support
from fieldkit.span.modes import span_modes
from fieldkit.span.supports import springs
from tests.detune.lines import RUNNING, TAPPED, UP_TO_HZ, riser, straight

STATES = (TAPPED, RUNNING)
CHANGES = (
    AddSupport(6.2, 4e6, 2e6),
    StiffenSupport(1, 3e7, 3e7),
    MoveSupport(1, 5.0),
    AddMass(6.0, 15.0),
    SetMass(0, 12.0),
    MoveMass(0, 1.5),
    AllOf((AddSupport(6.2, 4e6), SetMass(0, 0.0))),
)
KINDS = [change.kind for change in CHANGES]
COUNT = 6
EACH = pytest.mark.parametrize("change", CHANGES, ids=KINDS)


def joint_for(change, name=AS_DRAWN):
    span = pinned(straight())
    unknowns = unknowns_of(straight(), STATES)
    z = np.zeros((50, len(unknowns)))
    found = installed(span, change, name, believed(span, unknowns, z))
    return span, found, joint_of(span, found, stations_of(change, span), STATES)


def hertz(model, z):
    return model.modes(z).frequency_hz[:, :COUNT]


@EACH
def test_as_drawn_is_the_span_with_the_change_made(change):
    """At the medians: frequencies within 0.1 % of the change applied to the span and solved."""
    span, _, joint = joint_for(change)
    new = unknowns_of(joint.after_span, STATES)
    model = embedded(build(joint.after_span, TAPPED, new, UP_TO_HZ), joint.after, joint)
    nominal = hertz(model, np.zeros((1, len(joint.unknowns))))[0]
    applied = change.apply(span)
    plain = build(applied, TAPPED, unknowns_of(applied, STATES), UP_TO_HZ)
    expected = hertz(plain, np.zeros((1, len(plain.unknowns))))[0]
    assert nominal == pytest.approx(expected, rel=1e-3)


@EACH
def test_the_span_before_is_the_one_that_was_tapped(change):
    """Whatever joins it: members of the span keep their frequencies when they are lifted."""
    span, _, joint = joint_for(change)
    old = unknowns_of(straight(), STATES)
    z = np.random.default_rng(1).standard_normal((5, len(old)))
    own = np.random.default_rng(2).standard_normal((5, len(joint.unknowns)))
    cut = unknowns_of(joint.before_span, STATES)
    model = embedded(build(joint.before_span, TAPPED, cut, UP_TO_HZ), joint.before, joint)
    plain = build(straight(), TAPPED, old, UP_TO_HZ)
    lifted_z = lifted(joint, span, old, z, own)
    assert hertz(model, lifted_z) == pytest.approx(hertz(plain, z), rel=2e-3)


@EACH
def test_members_of_the_span_as_found_are_those_of_both(change):
    """The next change is looked for on members that ring as the joint ones do.

    To 0.6 %: how far a mass stands from where it was drawn within a stretch is not handed on.
    """
    _, found, joint = joint_for(change)
    z = 0.7 * np.random.default_rng(3).standard_normal((5, len(joint.unknowns)))
    cut = unknowns_of(joint.after_span, STATES)
    model = embedded(build(joint.after_span, TAPPED, cut, UP_TO_HZ), joint.after, joint)
    alone = unknowns_of(found.after, STATES)
    plain = build(found.after, TAPPED, alone, UP_TO_HZ)
    own = hertz(plain, lowered(joint, found, alone, z))
    assert own == pytest.approx(hertz(model, z), rel=6e-3)


@pytest.mark.parametrize("span", [straight(), riser()], ids=["straight", "riser"])
def test_writing_out_what_supports_imply_changes_nothing(span):
    stated = [
        [mode.frequency_hz for mode in span_modes(one, TAPPED, UP_TO_HZ)]
        for one in (span, pinned(span))
    ]
    assert stated[0] == pytest.approx(stated[1], rel=1e-9)
    assert [u.spread for u in unknowns_of(span, STATES)] == pytest.approx(
        [u.spread for u in unknowns_of(pinned(span), STATES)]
    )


def test_a_mark_holds_nothing():
    span = straight()
    cut = marked(span, (2.0, 4.1))
    assert len(cut.supports) == len(span.supports) + 1
    assert len(springs(cut)) == len(springs(span))


def test_ways_of_standing_differ_from_each_other():
    """A new support that hangs loose is one that is not there; a moved one is not."""
    assert set(ways(CHANGES[0])) == {AS_DRAWN, STIFFNESS, PLACE, MASS, NOTHING}
    assert LOOSE in ways(CHANGES[2])
    assert PLACE not in ways(CHANGES[1])
    assert set(ways(CHANGES[4])) == {AS_DRAWN, MASS, NOTHING}
    assert ways(ChangeSpeed("pump", 20.0, 21.0)) == (AS_DRAWN,)


def test_a_softer_support_is_an_unknown_of_its_own():
    """A moved support stands on other steel: what it was worth before does not bind it."""
    _, found, joint = joint_for(CHANGES[2], STIFFNESS)
    assert set(found.own_springs) == {(1, "vertical"), (1, "lateral"), (1, "axial")}
    own = [joint.keys[j] for j in joint.own]
    assert ("own", "spring", 1, "vertical") in own
    assert ("spring", 1, "vertical") in joint.keys


@EACH
def test_the_change_is_told_from_the_two_spans(change):
    """A job with the change in it and the job before are enough."""
    if isinstance(change, AllOf):
        change = AllOf((AddSupport(6.2, 4e6), SetMass(0, 5.0)))
    found = difference(straight(), change.apply(straight()))
    parts = found.parts if isinstance(found, AllOf) else (found,)
    wanted = change.parts if isinstance(change, AllOf) else (change,)
    assert {str(part) for part in parts} == {str(part) for part in wanted}


def test_two_jobs_of_other_pipes_are_no_change():
    with pytest.raises(InputError, match="different pipes"):
        difference(straight(), riser())
    with pytest.raises(InputError, match="same supports and masses"):
        difference(straight(), straight())


def test_a_support_that_is_gone_is_not_guessed_at():
    fewer = replace(straight(), supports=(Support(0.0, "anchor"),))
    with pytest.raises(InputError, match="fewer supports"):
        difference(straight(), fewer)
