"""The map of chances: equal to full solves, and honest about why a place cannot work."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np
import pytest

from fieldkit.detune import judge
from fieldkit.detune.candidates import Search
from fieldkit.detune.chance_map import ChanceMap, chance_map
from fieldkit.detune.excitation import Excitation, Goal, bands
from fieldkit.detune.fixes import AddSupport
from fieldkit.detune.rank import prepare
from fieldkit.span.layout import Leg, Span, State, Support
from fieldkit.span.materials import material
from fieldkit.span.pipes import standard_pipe
from tests.detune.lines import RUNNING, TAPPED, UP_TO_HZ, booster, riser, shaken

EMPTY = State("running")


def beam() -> Span:
    """One span of 6 m, built in at both ends."""
    return Span(
        standard_pipe("NPS 4", "40"),
        material("carbon steel"),
        (Leg((1.0, 0.0, 0.0), 6.0),),
        (Support(0.0, "anchor"), Support(6.0, "anchor")),
        (),
    )


@cache
def searching(name: str) -> Search:
    span = {"beam": beam(), "riser": riser(), "booster": booster()[0]}[name]
    found = booster()[2] if name == "booster" else None
    state = EMPTY if name == "beam" else RUNNING
    goal = Goal(up_to_hz=UP_TO_HZ, keep_out_m=((1.0, 1.4),))
    search, _ = prepare(span, TAPPED, state, found, shaken(15.6), goal)
    return well_known(search) if name == "beam" else search


def well_known(search: Search) -> Search:
    """The same with little doubt left, and the pump on the first mode of the middle member."""
    base = search.field
    z = base.z[base.central] + 0.03 * base.z
    sure = replace(base, z=z, modes=base.model.modes(z))
    first = float(sure.modes.frequency_hz[base.central][0])
    return replace(search, field=sure, bands=bands(shaken(first), search.goal.margin))


@cache
def mapped(name: str, kind: str, direction: str = "both") -> ChanceMap:
    return chance_map(searching(name), kind, direction)


@pytest.mark.parametrize("name", ["booster", "riser"])
@pytest.mark.parametrize("kind", ["support", "mass"])
def test_every_chance_is_that_of_full_solves(name, kind):
    """A dozen places and sizes: the share of solved members that are clear, within two members
    whose mode lies on an edge."""
    search, found = searching(name), mapped(name, kind)
    rng = np.random.default_rng(3)
    for i, j in zip(rng.integers(1, 59, 12), rng.integers(0, len(found.size), 12), strict=True):
        exact = _at(search, found, int(i), int(j))
        assert found.chance[i, j] == pytest.approx(exact, abs=3.0 / search.field.members)


def _at(search: Search, found: ChanceMap, i: int, j: int) -> float:
    change = found.change(i, j)
    key = {f: float(found.size[j]) for f in ("vertical_n_per_m", "lateral_n_per_m")}
    if isinstance(change, AddSupport):
        change = replace(change, at_m=float(found.station_m[i]), **key)
    else:
        change = replace(change, at_m=float(found.station_m[i]), mass_kg=float(found.size[j]))
    spectrum = judge.after(search.field, search.push(change), UP_TO_HZ)
    return judge.chance_clear(spectrum, search.bands, UP_TO_HZ)


def test_the_curve_brings_the_mode_to_the_edge_of_its_band():
    """A spring of k*(x) on the middle member puts its mode at the upper edge, within 1 %."""
    search = searching("beam")
    one = replace(search, field=search.field.some(np.array([search.field.central])),
                  scatter=replace(search.scatter, stiffness_factor=np.ones(1),
                                  place_m=np.zeros(1), as_drawn=None))  # fmt: skip
    found = chance_map(one, "support", "both")
    band = search.bands[0]
    i = 20
    k = float(found.curve[i])
    spring = AddSupport(float(found.station_m[i]), vertical_n_per_m=k, lateral_n_per_m=k)
    hertz = judge.after(one.field, one.push(spring), UP_TO_HZ).all_hz[0]
    assert np.nanmin(np.abs(hertz / band.avoid_high_hz - 1)) < 0.01


def test_no_spring_works_in_one_direction_where_both_planes_resonate():
    found = mapped("beam", "support", "vertical")
    assert found.chance.max() < 0.5
    free = [i for i in range(60) if not found.kept_out[i]]
    words = {found.words(i, len(found.size) - 1) for i in free[10:50]}
    assert any("moves another way" in text for text in words)


def test_a_support_at_the_node_of_a_mode_is_told_so():
    """The second mode of a built-in span stands still in the middle."""
    search = searching("beam")
    hertz = search.field.modes.frequency_hz[search.field.central]
    second = (Excitation("fan", frequency_hz=(0.99 * hertz[2], 1.01 * hertz[2])),)
    other = replace(search, bands=bands(second, 0.05))
    found = chance_map(other, "support", "both", stations=61)
    nodes = [i for i in range(20, 41) if found.still[2, i]]
    assert nodes
    assert all(found.words(i, 8).startswith("node of mode 3") for i in nodes)


def test_keep_outs_are_hatched_out_of_the_zone():
    found = mapped("beam", "support")
    kept = (found.station_m >= 1.0) & (found.station_m <= 1.4)
    assert kept.any()
    assert found.kept_out.tolist() == kept.tolist()
    assert not found.zone[kept].any()
    assert found.words(int(np.flatnonzero(kept)[0]), 3) == "kept out"


def test_a_mass_is_said_to_drop_a_mode_into_a_band():
    """A band just below the first mode: any mass brings the mode down into it."""
    search = searching("beam")
    first = search.field.modes.frequency_hz[search.field.central][0]
    below = (Excitation("pump", frequency_hz=(0.8 * first, 0.82 * first)),)
    found = chance_map(replace(search, bands=bands(below, 0.05)), "mass")
    worst = np.unravel_index(np.argmin(found.chance), found.chance.shape)
    assert found.words(*map(int, worst)).startswith("drops mode 1 into pump") or found.words(
        *map(int, worst)
    ).startswith("drops mode 2 into pump")


def test_without_a_mode_near_a_band_everything_is_clear():
    search = searching("beam")
    far = (Excitation("slow", frequency_hz=(0.5, 0.6)),)
    found = chance_map(replace(search, bands=bands(far, 0.1)), "support")
    assert found.mode == 0
    assert np.isnan(found.curve).all()
    assert found.chance.min() > 0.99
