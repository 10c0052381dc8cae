"""Springs under and at the ends of a uniform span, against their exact equations.

Stiffnesses are in units of the span's own k = 48 EI/L^3. The tables were solved from the equation
named in each test. The rule that a support be at least twice as stiff as its span is Wachel,
Morton & Atkins 1990 (from memory).
"""

import math

import numpy as np
import pytest
from scipy.optimize import brentq

from fieldkit.span import eigenvalues
from fieldkit.span.layout import Support
from tests.reference.spans import RIGID, SLENDER, hold, level_span, unit_hz, vertical_hz

END_SPRINGS = {
    # K/(48 EI/L^3) of each end: f over that of the rigidly pinned span
    0.25: 0.4516, 0.5: 0.5875, 1: 0.7227, 2: 0.8331, 3: 0.8809, 4: 0.9075, 5: 0.9245,
    6: 0.9362, 8: 0.9513, 10: 0.9606, 20: 0.9799, 50: 0.9918, 100: 0.9959,
}  # fmt: skip
CENTRE_SPRING = {
    # K L^3/(48 EI): f over that with a rigid centre support
    0.5: 0.3051, 1: 0.3510, 2: 0.4268, 4: 0.5429, 8: 0.7070, 16: 0.9155, 20: 0.9880, 20.748: 1.0,
}  # fmt: skip
ROTATIONAL_SPRINGS = {
    # k_r L/EI of each end: lambda^2
    0.1: 10.0658, 0.5: 10.7819, 1: 11.5518, 2: 12.7937, 5: 15.1894, 10: 17.2695, 20: 19.1294,
    50: 20.8202, 100: 21.5418,
}  # fmt: skip
LENGTH = 9.0
"""Of the slender pipe, L/D = 450: shear and rotary inertia take 3e-5 of a clamped first mode."""
MESHED_FOR = 100.0
"""lambda^2 the mesh is laid for, so that the first mode has no mesh error to speak of."""
NODE = 995.9135  # K L^3/EI = 4 (2 pi)^3/tanh(pi)


@pytest.mark.parametrize("stiffness", END_SPRINGS)
def test_span_on_end_springs(stiffness):
    """tan l + tanh l = 2 K L^3/(EI b^3), l = b/2; ends free to turn."""
    b = eigenvalues.on_end_springs(48 * stiffness, 1)[0]
    assert (b / math.pi) ** 2 == pytest.approx(END_SPRINGS[stiffness], abs=6e-5)


@pytest.mark.parametrize("stiffness", CENTRE_SPRING)
def test_span_with_centre_spring(stiffness):
    """tanh l - tan l = 4 b^3 EI/(K L^3)."""
    b = eigenvalues.pinned_with_centre_spring(48 * stiffness, 1)[0]
    assert (b / (2 * math.pi)) ** 2 == pytest.approx(CENTRE_SPRING[stiffness], abs=6e-5)


@pytest.mark.parametrize("stiffness", ROTATIONAL_SPRINGS)
def test_span_with_rotational_end_springs(stiffness):
    """tan l + tanh l = -2 b EI/(k_r L)."""
    b = eigenvalues.pinned_with_rotational_springs(stiffness, 1)[0]
    assert b**2 == pytest.approx(ROTATIONAL_SPRINGS[stiffness], abs=6e-5)


def test_node_stiffness():
    """From 995.9135 EI/L^3 on, a centre spring holds as well as a rigid support."""
    assert pytest.approx(NODE, abs=1e-4) == eigenvalues.NODE_STIFFNESS_RATIO
    at_node = eigenvalues.pinned_with_centre_spring(eigenvalues.NODE_STIFFNESS_RATIO, 1)[0]
    assert at_node == pytest.approx(2 * math.pi, rel=1e-12)


def model_lambda_squared(*supports):
    """First vertical mode of the span model on the slender pipe, as lambda^2."""
    span = level_span(LENGTH, list(supports))
    unit = unit_hz(span, LENGTH)
    return vertical_hz(span, 1, MESHED_FOR * unit)[0] / unit


def own_stiffness(span_length_m):
    """EI/L^3 of the slender pipe."""
    return 2e11 * SLENDER.second_moment_m4 / span_length_m**3


@pytest.mark.parametrize("stiffness", END_SPRINGS)
def test_model_on_end_springs(stiffness):
    """The span model meets the exact root within 0.01 % and the table to its four figures."""
    k = 48 * stiffness * own_stiffness(LENGTH)
    ends = [Support(at, "free", k, RIGID, RIGID, 0.0) for at in (0.0, LENGTH)]
    found = model_lambda_squared(*ends)
    assert found == pytest.approx(eigenvalues.on_end_springs(48 * stiffness, 1)[0] ** 2, rel=1e-4)
    assert found / math.pi**2 == pytest.approx(END_SPRINGS[stiffness], abs=1e-4)


@pytest.mark.parametrize("stiffness", CENTRE_SPRING)
def test_model_with_centre_spring(stiffness):
    """The same for a spring under the middle of a pinned span."""
    k = 48 * stiffness * own_stiffness(LENGTH)
    centre = Support(LENGTH / 2, "free", k, 0.0, 0.0, 0.0)
    found = model_lambda_squared(hold(0.0), centre, hold(LENGTH))
    exact = eigenvalues.pinned_with_centre_spring(48 * stiffness, 1)[0] ** 2
    assert found == pytest.approx(exact, rel=1e-4)
    assert found / (2 * math.pi) ** 2 == pytest.approx(CENTRE_SPRING[stiffness], abs=1e-4)


@pytest.mark.parametrize("stiffness", ROTATIONAL_SPRINGS)
def test_model_with_rotational_springs(stiffness):
    """The same for rotational springs at pinned ends."""
    k = stiffness * own_stiffness(LENGTH) * LENGTH**2
    ends = [Support(at, "free", RIGID, RIGID, RIGID, k) for at in (0.0, LENGTH)]
    found = model_lambda_squared(*ends)
    exact = eigenvalues.pinned_with_rotational_springs(stiffness, 1)[0] ** 2
    assert found == pytest.approx(exact, rel=1e-4)
    assert found == pytest.approx(ROTATIONAL_SPRINGS[stiffness], rel=1e-4)


@pytest.mark.parametrize("stiffness", [0.5, 2.0, 8.0])
def test_stiffness_is_recovered_from_a_frequency(stiffness):
    """A frequency synthesised by the exact root gives back its K through the model, within 1 %."""
    measured = eigenvalues.on_end_springs(48 * stiffness, 1)[0] ** 2

    def misfit(log_share):
        k = 48 * math.exp(log_share) * own_stiffness(LENGTH)
        ends = [Support(at, "free", k, RIGID, RIGID, 0.0) for at in (0.0, LENGTH)]
        return model_lambda_squared(*ends) - measured

    found = math.exp(brentq(misfit, math.log(stiffness / 5), math.log(stiffness * 5), xtol=1e-4))
    assert found == pytest.approx(stiffness, rel=0.01)


def test_model_finds_the_node_threshold():
    """Below 995.9 EI/L^3 a stiffer centre spring still helps, above it no longer does."""

    def first(ratio):
        k = ratio * own_stiffness(LENGTH)
        return model_lambda_squared(
            hold(0.0), Support(LENGTH / 2, "free", k, 0.0, 0.0, 0.0), hold(LENGTH)
        )

    rigid = first(1e6)
    assert rigid == pytest.approx((2 * math.pi) ** 2, rel=1e-4)
    assert first(NODE * 0.995) < rigid * (1 - 1e-3)
    assert first(NODE * 1.005) == pytest.approx(rigid, rel=1e-7)


@pytest.mark.parametrize(
    "on_springs",
    [
        eigenvalues.on_end_springs,
        eigenvalues.pinned_with_centre_spring,
        eigenvalues.pinned_with_rotational_springs,
        eigenvalues.cantilever_on_root_spring,
    ],
)
def test_stiffer_springs_never_lower_a_mode(on_springs):
    """Rayleigh's theorem, over twelve decades of stiffness."""
    found = np.array([on_springs(ratio, 3) for ratio in np.logspace(-4, 8, 40)])
    assert np.all(np.diff(found, axis=0) >= -1e-12)


def test_limits_of_the_springs():
    """No spring and a rigid one give the neighbouring end conditions."""
    pinned, clamped = (eigenvalues.single_span(f"{e}-{e}", 1)[0] for e in ("pinned", "clamped"))
    cantilever = eigenvalues.single_span("clamped-free", 3)
    assert eigenvalues.on_end_springs(0, 1)[0] == 0.0
    assert eigenvalues.on_end_springs(1e12, 1)[0] == pytest.approx(pinned)
    assert eigenvalues.pinned_with_rotational_springs(0, 1)[0] == pytest.approx(pinned)
    assert eigenvalues.pinned_with_rotational_springs(1e12, 1)[0] == pytest.approx(clamped)
    assert eigenvalues.cantilever_on_root_spring(1e12, 3) == pytest.approx(cantilever)
    with pytest.raises(ValueError, match="root free to turn"):
        eigenvalues.cantilever_on_root_spring(0)
