"""Axial force: AFNOR/SFM, Guide de validation des progiciels de calcul de structures, 1990, SDLL05.

Pinned bar 2 m long, 50 x 50 mm, 200 GPa, 7800 kg/m^3; answers as quoted in a public verification
report of a structural analysis code. The closed form f = f0 sqrt(1 + P/Pcr) with Pcr = n^2 pi^2
EI/L^2, P tension positive, is exact for pinned ends.
"""

import math
from dataclasses import replace

import numpy as np
import pytest

from fieldkit.errors import Refusal
from fieldkit.span.layout import State, Support
from fieldkit.span.modes import span_modes
from tests.reference.element_chain import RZ, UY, chain, ends_held, frequencies_hz, kept, matrices
from tests.reference.spans import RIGID, SLENDER, STEEL, level_span
from tests.reference.spans import frequencies_hz as modes_of

PUBLISHED = {0.0: (28.702, 114.807), -100e3: (22.434, 109.080)}
"""Axial force in newtons: the first two frequencies in Hz."""
LENGTH, SIDE = 2.0, 0.05
EI, MASS = 200e9 * SIDE**4 / 12, 7800 * SIDE**2


@pytest.mark.parametrize("force", PUBLISHED)
def test_sdll05(force):
    """No load, and 100 kN of compression, within 0.05 %."""
    k, m = matrices(chain(20, LENGTH, EI, MASS), force)
    mask = kept(len(k), (UY, RZ), ends_held("pinned-pinned"))
    assert frequencies_hz(k, m, mask, 2) == pytest.approx(PUBLISHED[force], rel=5e-4)


def test_critical_loads():
    """257.021 and 1028.084 kN, and the frequencies by the closed form."""
    n = np.array([1, 2])
    critical = n**2 * math.pi**2 * EI / LENGTH**2
    assert critical / 1e3 == pytest.approx([257.021, 1028.084], abs=1e-3)
    by_formula = np.array(PUBLISHED[0.0]) * np.sqrt(1 - 100e3 / critical)
    assert by_formula == pytest.approx([22.4337, 109.0803], rel=5e-5)


def heated(rise_k, rotation=0.0, length=6.0):
    """A level slender pipe held along its axis at both ends, and its state when warmer."""
    held = [Support(at, "free", RIGID, RIGID, math.inf, rotation) for at in (0.0, length)]
    material = replace(STEEL, expansion_per_k=12e-6)
    state = State("running", fill=(0.0, 0.0), temperature_k=293.15 + rise_k)
    return level_span(length, held, material=material), state


@pytest.mark.parametrize("share", [-0.9, -0.5, 0.5, 3.0])
def test_restrained_heat_softens_a_held_pipe(share):
    """P = -E A alpha dT between rigid anchors; share of the Euler load, within 0.05 %."""
    area, bending = SLENDER.wall_area_m2, 2e11 * SLENDER.second_moment_m4
    critical = math.pi**2 * bending / 6.0**2
    rise = -share * critical / (2e11 * area * 12e-6)
    span, state = heated(rise)
    free = modes_of(span_modes(span, replace(state, temperature_k=293.15), 30.0), "vertical", 2)
    found = modes_of(span_modes(span, state, 30.0), "vertical", 2)
    expected = free * np.sqrt(1 + share / np.array([1, 4]))
    assert found == pytest.approx(expected, rel=5e-4)


def test_beyond_the_euler_load_it_is_refused():
    """A pipe that buckles has no frequency to give."""
    critical = math.pi**2 * SLENDER.second_moment_m4 / SLENDER.wall_area_m2 / 6.0**2
    span, state = heated(1.02 * critical / 12e-6)
    with pytest.raises(Refusal, match="buckles"):
        span_modes(span, state, 30.0)


def test_clamped_pipe_stands_four_times_the_load():
    """Clamped Euler load 4 pi^2 EI/L^2: stable just below, refused just above."""
    critical = 4 * math.pi**2 * SLENDER.second_moment_m4 / SLENDER.wall_area_m2 / 6.0**2
    span, state = heated(0.98 * critical / 12e-6, RIGID)
    assert span_modes(span, state, 30.0)
    span, state = heated(1.02 * critical / 12e-6, RIGID)
    with pytest.raises(Refusal, match="buckles"):
        span_modes(span, state, 30.0)
