"""Ten modes and an attachment vector per row against models built anew with the change in them."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np
import pytest

from fieldkit.detune import judge
from fieldkit.detune.candidates import Search
from fieldkit.detune.excitation import Goal
from fieldkit.detune.fixes import (
    AddMass,
    AddSupport,
    AllOf,
    MoveMass,
    MoveSupport,
    SetMass,
    StiffenSupport,
)
from fieldkit.detune.inside import inside_flexibility
from fieldkit.detune.lowrank import condensed
from fieldkit.detune.rank import prepare
from fieldkit.span.layout import State
from tests.detune.lines import TAPPED, UP_TO_HZ, riser, shaken, straight

COLD = State("running", (1.0, 1.0))
CHANGES = (
    AddSupport(2.52, vertical_n_per_m=3e6, lateral_n_per_m=3e6),
    AddSupport(5.96, vertical_n_per_m=3e7),
    AddMass(5.0, 15.0),
    SetMass(0, 0.0),
    SetMass(0, 40.0),
    StiffenSupport(1, 3e7, 3e7),
    AllOf((AddSupport(2.5, 3e6, 3e6), AddMass(5.9, 12.0))),
)


@cache
def at_the_medians(name: str) -> Search:
    """Two equal members with every unknown at its prior median."""
    span = straight() if name == "straight" else riser()
    goal = Goal(up_to_hz=UP_TO_HZ)
    search, _ = prepare(span, TAPPED, COLD, None, shaken(14.0), goal)
    z = np.zeros((2, search.field.z.shape[1]))
    base = replace(search.field, z=z, modes=search.field.model.modes(z), central=0)
    as_drawn = replace(
        search.scatter, stiffness_factor=np.ones(2), place_m=np.zeros(2), as_drawn=None
    )
    return replace(search, field=base, scatter=as_drawn)


@pytest.mark.parametrize("name", ["straight", "riser"])
@pytest.mark.parametrize("change", CHANGES)
def test_every_mode_up_to_the_limit_is_that_of_the_model_built_anew(name, change):
    """Within 0.05 %, places inside an element and offset masses included."""
    search = at_the_medians(name)
    spectrum = judge.after(search.field, search.push(change), UP_TO_HZ)
    exact = judge.resolve(search.field, search.span, COLD, change, UP_TO_HZ)
    quick = spectrum.all_hz[0][~np.isnan(spectrum.all_hz[0])][: len(exact)]
    assert quick == pytest.approx(exact, rel=5e-4)


@pytest.mark.parametrize("name", ["straight", "riser"])
@pytest.mark.parametrize(
    "change",
    [
        AddSupport(1.3, axial_n_per_m=1e6),
        AddSupport(1.3, lateral_n_per_m=5e6),
        MoveMass(0, 3.2),
    ],
)
def test_they_agree_as_the_mesh_allows_where_a_new_node_sharpens_it(name, change):
    """0.15 %: the mesh rule itself keeps every mode within 0.1 %."""
    search = at_the_medians(name)
    spectrum = judge.after(search.field, search.push(change), UP_TO_HZ)
    exact = judge.resolve(search.field, search.span, COLD, change, UP_TO_HZ)
    quick = spectrum.all_hz[0][~np.isnan(spectrum.all_hz[0])][: len(exact)]
    assert quick == pytest.approx(exact, rel=1.5e-3)


@pytest.mark.parametrize("name", ["straight", "riser"])
def test_a_moved_support_is_that_of_the_model_built_anew(name):
    """Within 0.1 %: its stretches of pipe get other lengths to doubt."""
    search = at_the_medians(name)
    change = MoveSupport(1 if name == "straight" else 2, 5.0)
    spectrum = judge.after(search.field, search.push(change), UP_TO_HZ)
    exact = judge.resolve(search.field, search.span, COLD, change, UP_TO_HZ)
    quick = spectrum.all_hz[0][~np.isnan(spectrum.all_hz[0])][: len(exact)]
    assert quick == pytest.approx(exact, rel=1e-3)


def test_ten_modes_and_an_attachment_vector_do_what_all_modes_do():
    """Within 0.01 % below half the highest kept mode, from soft to rigid."""
    base = at_the_medians("riser").field
    push = at_the_medians("riser").push(AddSupport(2.5, vertical_n_per_m=1e6))
    few = condensed(base.modes, push.rows, push.residual, 20)
    every = condensed(base.modes, push.rows, push.residual, base.modes.eigenvalue.shape[1])
    size = np.array([1e5, 1e6, 1e7, 1e9])[:, None, None] * np.ones((1, base.members, 1))
    limit = 0.5 * base.modes.frequency_hz[0, 19]
    hertz = [np.sqrt(np.maximum(seen.eigenvalues(size), 0)) / (2 * np.pi) for seen in (few, every)]
    below = hertz[1] < limit
    assert below.sum() > 40
    assert hertz[0][..., : below.shape[-1]][below[..., : hertz[0].shape[-1]]] == pytest.approx(
        hertz[1][below], rel=1e-4
    )


def test_a_point_inside_an_element_gives_way_like_a_beam_held_at_both_ends():
    """a^3 b^3 / (3 EI L^3) and the shear part between: Roark's Formulas for Stress and Strain,
    beam fixed at both ends with one force (from memory); slender here to 8 %."""
    structure = at_the_medians("straight").field.model.structure
    start, end = structure.station_m[3:5]
    at_m, rigidity = 0.4 * start + 0.6 * end, structure.elements.bending_rigidity_n_m2[3]
    a, b, length = at_m - start, end - at_m, end - start
    bending = a**3 * b**3 / (3 * rigidity * length**3)
    found = inside_flexibility(structure, at_m)[2, 2]
    shear = a * b / length / structure.elements.shear_rigidity_n[3]
    assert bending < found < bending + 1.1 * shear
    assert np.all(inside_flexibility(structure, start) == 0)
