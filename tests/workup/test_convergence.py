"""Cutting the elements of the mesh in two moves no frequency by more than the mesh allows."""

from __future__ import annotations

import math

import pytest

from fieldkit.errors import Refusal
from fieldkit.span.layout import Leg, Span, State, Support
from fieldkit.span.materials import material
from fieldkit.span.mesh import MESH_ERROR
from fieldkit.span.pipes import PipeSection
from fieldkit.workup import convergence as checked
from fieldkit.workup.convergence import one_convergence

PIPE = PipeSection(0.0889, 0.00549)


def pinned(length_m: float) -> Span:
    """A long thin beam, held as a textbook's simply supported one."""
    ends = [
        Support(at, "free", vertical=math.inf, lateral=math.inf, axial=math.inf, torsion=math.inf)
        for at in (0.0, length_m)
    ]
    return Span(PIPE, material("carbon steel"), (Leg((1.0, 0.0, 0.0), length_m),), tuple(ends))


def test_the_finer_mesh_agrees_and_comes_nearer_to_the_closed_form():
    """f = pi/2 sqrt(EI/mL^4) (Thomson, Theory of Vibration with Applications), slender to 0.1 %."""
    span = pinned(9.0)
    found = one_convergence(span, State("tapped", (0.0, 0.0)), 100.0)
    assert found.finer_elements >= 2 * found.elements
    assert found.largest_change is not None
    assert 0 < found.largest_change < MESH_ERROR
    EI = span.material.modulus_at(293.15) * PIPE.second_moment_m4
    m = span.material.density_kg_per_m3 * PIPE.wall_area_m2
    exact_hz = math.pi / 2 * math.sqrt(EI / (m * 9.0**4))
    assert found.finer_hz[0] == pytest.approx(exact_hz, rel=1e-3)
    assert found.finer_hz[-1] <= found.frequency_hz[len(found.finer_hz) - 1] * (1 + 1e-9)


def test_a_mesh_that_cannot_be_made_finer_says_why(monkeypatch):
    assemble = checked.assemble

    def refusing(*args, extra_stations_m=(), **words):
        if extra_stations_m:
            raise Refusal("too many nodes", "lower the limit")
        return assemble(*args, **words)

    monkeypatch.setattr(checked, "assemble", refusing)
    found = one_convergence(pinned(4.0), State("tapped", (0.0, 0.0)), 100.0)
    assert found.frequency_hz
    assert found.largest_change is None
    assert "too many nodes" in found.refused
