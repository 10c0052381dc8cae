"""Axial force from heat and pressure, and what buckles under it."""

from __future__ import annotations

import math
import re
from dataclasses import replace

import numpy as np
import pytest

from fieldkit.errors import Refusal
from fieldkit.span.layout import Span, State, Support
from fieldkit.span.materials import material
from fieldkit.span.modes import span_modes
from fieldkit.span.pipes import standard_pipe
from fieldkit.span.structure import assemble
from tests.reference.spans import anchored, hold, level_span, square_legs

PIPE = standard_pipe("NPS 4", "40")
STEEL = material("carbon steel")
WARM = State("running", temperature_k=303.15)
PRESSED = State("running", pressure_pa=40e5)


def line(supports: list[Support]) -> Span:
    return level_span(4.0, supports, pipe=PIPE, material=STEEL)


def force_n(span: Span, state: State) -> np.ndarray:
    return assemble(span, state, up_to_hz=100.0).axial_force_n


def test_held_pipe_under_heat_and_pressure():
    """S = -EA alpha dT - (1 - 2 nu) p A_bore between rigid anchors (Sparks 1984, from memory)."""
    span = line([anchored(0.0), anchored(4.0)])
    rigidity = STEEL.modulus_at(WARM.temperature_k) * PIPE.wall_area_m2
    heat = -rigidity * STEEL.expansion_per_k * 10.0
    assert force_n(span, WARM) == pytest.approx(heat, rel=1e-3)
    thrust = -(1 - 2 * 0.3) * 40e5 * PIPE.bore_area_m2
    assert force_n(span, PRESSED) == pytest.approx(thrust, rel=1e-3)


@pytest.mark.parametrize("state", [WARM, PRESSED])
def test_a_pipe_free_to_grow_carries_no_effective_force(state):
    """End caps pull the wall as hard as the contents push: S = 0."""
    span = line([anchored(0.0), replace(hold(4.0), axial=0.0)])
    assert np.abs(force_n(span, state)).max() < 1.0


def test_soft_anchors_share_the_growth_with_the_pipe():
    """Two springs k in series with EA/L."""
    soft = replace(anchored(0.0), axial=5e7), replace(anchored(4.0), axial=5e7)
    rigidity = STEEL.modulus_at(WARM.temperature_k) * PIPE.wall_area_m2
    growth = STEEL.expansion_per_k * 10.0 * 4.0
    expected = -growth / (4.0 / rigidity + 2 / 5e7)
    assert force_n(line(list(soft)), WARM) == pytest.approx(expected, rel=1e-6)


def test_a_leg_across_gives_way():
    """An L between anchors is soft along both legs: a fraction of the straight line's force."""
    legs = square_legs([4.0, 2.0], ["+x", "+y"], 0.15)
    bent = Span(PIPE, STEEL, legs, (anchored(0.0), anchored(6.0)))
    straight = force_n(line([anchored(0.0), anchored(4.0)]), WARM)
    assert np.abs(force_n(bent, WARM)).max() < 0.02 * abs(straight[0])


def test_as_built_there_is_no_force():
    """At 20 degC and no pressure the structure is the bare one."""
    span = line([anchored(0.0), anchored(4.0)])
    plain = assemble(span, State("tapped"), up_to_hz=100.0)
    assert not plain.axial_force_n.any()
    bare = assemble(span, WARM, up_to_hz=100.0, axial=False)
    assert not bare.axial_force_n.any()


def test_cooling_tightens_and_heat_slackens():
    span = line([anchored(0.0), anchored(4.0)])
    cold, built, warm = (
        span_modes(span, State("s", temperature_k=k), 100.0)[0].frequency_hz
        for k in (283.15, 293.15, 303.15)
    )
    assert cold > built > warm


def test_buckling_is_refused_with_force_temperature_and_remedy():
    """120 degC between rigid anchors 8 m apart is beyond 4 pi^2 EI/L^2."""
    span = level_span(8.0, [anchored(0.0), anchored(8.0)], pipe=PIPE, material=STEEL)
    state = State("running", temperature_k=393.15)
    modulus = STEEL.modulus_at(393.15)
    compression = modulus * PIPE.wall_area_m2 * STEEL.expansion_per_k * 100.0
    assert compression > 4 * math.pi**2 * modulus * PIPE.second_moment_m4 / 64
    for attempt in (assemble, span_modes):
        with pytest.raises(Refusal, match="buckles in the running state: at 120 degC") as refused:
            attempt(span, state, up_to_hz=100.0)
        told = re.search(r"carry ([\d.]+) kN of compression", refused.value.reason)
        assert told is not None
        assert float(told[1]) == pytest.approx(compression / 1e3, rel=2e-3)
        assert "axial" in refused.value.measure_next
