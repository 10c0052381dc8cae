"""The mesh keeps every frequency below its limit within 0.1 %, and refuses the absurd."""

import numpy as np
import pytest

from fieldkit.errors import Refusal
from fieldkit.span.layout import Leg, PointMass, Span, Support
from fieldkit.span.modes import solve, span_matrices
from fieldkit.span.structure import Structure, assemble
from fieldkit.span.supports import springs
from tests.reference.spans import STATE, STEEL, anchored, level_span
from tests.span.drawn import FULL, drawn_span, four_times_finer, limit_hz


def frequencies_hz(structure: Structure, up_to_hz: float) -> np.ndarray:
    span = structure.span
    matrices = span_matrices(structure, springs(span), span.masses)
    return solve(*matrices, up_to_hz=up_to_hz)[0]


@pytest.mark.parametrize("seed", range(24))
def test_every_frequency_is_within_a_thousandth_of_a_four_times_finer_mesh(seed):
    """Random lines of nought to three bends, down to eight diameters long, up to mode 12 or so."""
    span = drawn_span(seed, bends=seed % 4)
    up_to = limit_hz(span, 3 + seed % 10)
    coarse = assemble(span, FULL, up_to_hz=up_to)
    own = frequencies_hz(coarse, up_to)
    finer = frequencies_hz(four_times_finer(coarse, up_to), 1.01 * up_to)[: len(own)]
    assert len(finer) == len(own)
    assert own == pytest.approx(finer, rel=1e-3)


def test_nodes_stand_at_ends_bends_supports_masses_and_where_asked():
    legs = (Leg((1.0, 0.0, 0.0), 2.0), Leg((0.0, 0.0, 1.0), 1.0, 0.3))
    span = Span(
        drawn_span(0, 0).pipe, STEEL, legs, (Support(0.61, "clamp"),), (PointMass(1.43, 5.0),)
    )
    stations = assemble(span, STATE, up_to_hz=20.0, extra_stations_m=(0.91,)).station_m
    for wanted in (0.0, 0.61, 0.91, 1.43, 1.7, 2.3, 3.0):
        assert np.abs(stations - wanted).min() < 1e-9


def test_two_stations_a_hair_apart_share_a_node():
    """A support and a mass 0.1 mm apart do not breed an element of 0.1 mm."""
    span = level_span(3.0, [anchored(0.0), Support(1.5, "clamp")], (PointMass(1.5001, 9.0),))
    structure = assemble(span, STATE, up_to_hz=50.0)
    assert np.diff(structure.station_m).min() > 1e-3


def test_a_higher_limit_lays_more_nodes_and_never_fewer_than_four_to_a_stretch():
    span = level_span(6.0, [anchored(0.0), anchored(6.0)])
    counts = [len(assemble(span, STATE, up_to_hz=f).station_m) for f in (0.1, 100.0, 1000.0)]
    assert counts[0] == 5
    assert counts[0] < counts[1] < counts[2]


def test_absurd_meshes_are_refused_with_what_to_do():
    span = level_span(500.0, [anchored(0.0), anchored(500.0)])
    with pytest.raises(Refusal, match=r"more than 2000 nodes") as refused:
        assemble(span, STATE, up_to_hz=5000.0)
    assert "up_to" in refused.value.measure_next
