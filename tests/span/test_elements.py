"""One element at a time: what statics and rigid motion demand of its matrices."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.span import elements
from fieldkit.span.elements import ElementSet

E, G, KAPPA, A, I = 2.0e11, 7.7e10, 0.53, 1.4e-3, 1.25e-6  # noqa: E741
LENGTH = 0.6
MASS = 17.0


def one_element(length=LENGTH, direction=(1.0, 0.0, 0.0), flexibility=1.0) -> ElementSet:
    unit = np.array([direction]) / np.linalg.norm(direction)
    return ElementSet(
        length_m=np.array([length]),
        axes=elements.local_axes(unit),
        offset_m=np.zeros((1, 3)),
        axial_rigidity_n=np.array([E * A]),
        bending_rigidity_n_m2=np.array([E * I / flexibility]),
        torsional_rigidity_n_m2=np.array([2 * G * I]),
        shear_rigidity_n=np.array([KAPPA * G * A]),
        mass_kg_per_m=np.array([MASS]),
        rotary_inertia_kg_m=np.array([7850 * I]),
    )


def rigid_motions(vector: np.ndarray) -> np.ndarray:
    """Six rigid motions (12, 6) of two nodes ``vector`` apart."""
    columns = []
    for axis in np.eye(3):
        columns.append(np.concatenate([axis, np.zeros(3), axis, np.zeros(3)]))
        columns.append(np.concatenate([np.zeros(3), axis, np.cross(axis, vector), axis]))
    return np.array(columns).T


def test_cantilever_tip_under_end_loads_is_exact_with_one_element():
    """PL^3/3EI + PL/(kappa G A), ML/EI, NL/EA and TL/GJ, to rounding."""
    flexibility = np.linalg.inv(elements.stiffness(one_element())[0][6:, 6:])
    across = LENGTH**3 / (3 * E * I) + LENGTH / (KAPPA * G * A)
    turn = LENGTH / (E * I)
    expected = [LENGTH / (E * A), across, across, LENGTH / (2 * G * I), turn, turn]
    assert np.diag(flexibility) == pytest.approx(expected, rel=1e-9)
    assert flexibility[1, 5] == pytest.approx(LENGTH**2 / (2 * E * I), rel=1e-9)
    assert flexibility[2, 4] == pytest.approx(-(LENGTH**2) / (2 * E * I), rel=1e-9)


@settings(max_examples=25, deadline=None)
@given(st.tuples(*[st.floats(-1, 1)] * 3).filter(lambda v: np.linalg.norm(v) > 0.1))
def test_rigid_motion_strains_nothing_and_carries_the_whole_mass(direction):
    """Whatever way the element points; the mass matrix gives m L for every translation."""
    element = one_element(direction=direction)
    vector = LENGTH * element.axes[0, 0]
    rigid = rigid_motions(vector)
    stiffness, mass = elements.stiffness(element)[0], elements.mass(element)[0]
    assert np.abs(stiffness @ rigid).max() < 1e-9 * np.abs(stiffness).max()
    inertia = rigid.T @ mass @ rigid
    assert inertia[::2, ::2] == pytest.approx(MASS * LENGTH * np.eye(3), abs=1e-9)


def test_turning_inertia_about_the_first_node_is_that_of_a_rod():
    """m L^3/3 plus the rotary inertia rho I L across, and 2 rho I L about the axis."""
    mass = elements.mass(one_element())[0]
    rigid = rigid_motions(np.array([LENGTH, 0.0, 0.0]))[:, 1::2]
    across = MASS * LENGTH**3 / 3 + 7850 * I * LENGTH
    assert rigid.T @ mass @ rigid == pytest.approx(
        np.diag([2 * 7850 * I * LENGTH, across, across]), abs=1e-9
    )


def test_matrices_are_symmetric_and_mass_is_positive():
    element = one_element(direction=(0.3, -0.5, 0.8))
    force = np.array([1e4])
    for matrix in (
        elements.stiffness(element)[0],
        elements.mass(element)[0],
        elements.geometric_stiffness(element, force)[0],
    ):
        assert matrix == pytest.approx(matrix.T, rel=1e-12, abs=1e-6)
    assert np.linalg.eigvalsh(elements.mass(element)[0]).min() > 0


def test_bend_flexibility_divides_bending_only():
    """A factor of 7 makes the tip turn 7 times as far and leaves stretch and twist alone."""
    plain = np.linalg.inv(elements.stiffness(one_element())[0][6:, 6:])
    bent = np.linalg.inv(elements.stiffness(one_element(flexibility=7.0))[0][6:, 6:])
    ratio = np.diag(bent) / np.diag(plain)
    assert ratio[[0, 3, 4, 5]] == pytest.approx([1.0, 1.0, 7.0, 7.0])


def test_string_stiffness_of_tension():
    """One end lifted by a rigid tilt under tension P pulls back with P/L."""
    force = np.array([5e4])
    geometric = elements.geometric_stiffness(one_element(), force)[0]
    tilt = np.zeros(12)
    tilt[7], tilt[[5, 11]] = 1.0, 1 / LENGTH
    assert geometric @ tilt == pytest.approx(
        [0, -force[0] / LENGTH, 0, 0, 0, 0, 0, force[0] / LENGTH, 0, 0, 0, 0], abs=1e-6
    )


@pytest.mark.parametrize("xi", [0.0, 0.21, 0.5, 0.87, 1.0])
def test_motion_inside_follows_a_loaded_cantilever(xi):
    """Deflection and section rotation of a tip-loaded cantilever at any station, shear included."""
    element = one_element(direction=(0.0, 1.0, 0.0))
    x, load = xi * LENGTH, 1e4
    force = np.zeros(12)
    force[8] = load
    moved = np.zeros(12)
    moved[6:] = np.linalg.solve(elements.stiffness(element)[0][6:, 6:], force[6:])
    translation, rotation = elements.motion_inside(element, 0, xi)
    bent = load * x**2 * (3 * LENGTH - x) / (6 * E * I) + load * x / (KAPPA * G * A)
    assert translation @ moved == pytest.approx([0, 0, bent], abs=1e-12)
    turned = load * x * (2 * LENGTH - x) / (2 * E * I)
    assert rotation @ moved == pytest.approx([turned, 0, 0], abs=1e-12)


def test_bend_flexibility_factor_is_never_below_one():
    """A heavy wall on a large radius bends as straight pipe."""
    factor = elements.bend_flexibility(np.array([5.0, np.inf]), 0.04, 0.01, 0.0, 2e11)
    assert factor == pytest.approx([1.0, 1.0])
