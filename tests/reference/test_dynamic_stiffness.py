"""The second solver against closed forms, before it judges anything."""

import math

import numpy as np
import pytest

from fieldkit.span import eigenvalues
from tests.reference.dynamic_stiffness import Attachment, Beam, natural_frequencies_hz

EI, M_PER_M, LENGTH = 2.1e5, 9.3, 3.7
BEAM = Beam(EI, M_PER_M)
RIGID = math.inf
ENDS = {"clamped": (RIGID, RIGID), "pinned": (RIGID, 0.0), "guided": (0.0, RIGID), "free": (0, 0)}


def hold(at_m, kind):
    translation, rotation = ENDS[kind]
    return Attachment(at_m, translation, rotation)


def eigenvalues_of(attachments, count, beam=BEAM, length=LENGTH):
    frequencies = natural_frequencies_hz(beam, length, attachments, count)
    unit = math.sqrt(beam.bending_n_m2 / beam.mass_kg_per_m) / (2 * math.pi * length**2)
    return np.sqrt(frequencies / unit)


@pytest.mark.parametrize("ends", eigenvalues.END_CONDITIONS)
def test_end_conditions(ends):
    """Ten pairs of ends, eight modes, to eight figures."""
    left, right = ends.split("-")
    found = eigenvalues_of([hold(0.0, left), hold(LENGTH, right)], 8)
    assert found == pytest.approx(eigenvalues.single_span(ends, 8), rel=1e-8)


@pytest.mark.parametrize("spans", [2, 3, 7])
@pytest.mark.parametrize("ends", ["pinned-pinned", "clamped-pinned", "clamped-clamped"])
def test_equal_spans(spans, ends):
    """Clusters of close modes, none missed."""
    left, right = ends.split("-")
    between = [hold(LENGTH * i / spans, "pinned") for i in range(1, spans)]
    found = eigenvalues_of([hold(0.0, left), *between, hold(LENGTH, right)], 12) / spans
    assert found == pytest.approx(eigenvalues.equal_spans(spans, ends, 12), rel=1e-8)


@pytest.mark.parametrize("mu", [0.1, 1.0, 10.0])
def test_tip_mass(mu):
    """The cantilever's transcendental equation."""
    mass = Attachment(LENGTH, mass_kg=mu * M_PER_M * LENGTH)
    found = eigenvalues_of([hold(0.0, "clamped"), mass], 5)
    assert found == pytest.approx(eigenvalues.cantilever_with_tip_mass(mu), rel=1e-8)


@pytest.mark.parametrize("ratio", [0.3, 3.0, 300.0])
def test_springs(ratio):
    """A root spring, and a spring in the middle of a pinned span with its antisymmetric modes."""
    root = Attachment(0.0, RIGID, ratio * EI / LENGTH)
    assert eigenvalues_of([root], 4) == pytest.approx(
        eigenvalues.cantilever_on_root_spring(ratio, 4), rel=1e-8
    )
    centre = Attachment(LENGTH / 2, ratio * EI / LENGTH**3)
    found = eigenvalues_of([hold(0.0, "pinned"), centre, hold(LENGTH, "pinned")], 4)
    symmetric = eigenvalues.pinned_with_centre_spring(ratio, 2)
    exact = np.sort([*symmetric, 2 * math.pi, 4 * math.pi])
    assert found == pytest.approx(exact, rel=1e-8)


def test_axial_force():
    """Pinned: f = f0 sqrt(1 + P L^2/(n^2 pi^2 EI))."""
    critical = math.pi**2 * EI / LENGTH**2
    beam = Beam(EI, M_PER_M, tension_n=-0.4 * critical)
    found = eigenvalues_of([hold(0.0, "pinned"), hold(LENGTH, "pinned")], 3, beam)
    n = np.arange(1, 4)
    assert found == pytest.approx(n * math.pi * (1 - 0.4 / n**2) ** 0.25, rel=1e-8)


def test_timoshenko_pinned():
    """Pinned Timoshenko beam: w = sin kx, psi = cos kx solve it exactly, two frequencies each."""
    shear, rotary = 3.0e6, 0.02
    beam = Beam(EI, M_PER_M, shear, rotary)
    found = natural_frequencies_hz(beam, LENGTH, [hold(0, "pinned"), hold(LENGTH, "pinned")], 5)
    exact = []
    for n in range(1, 6):
        k = n * math.pi / LENGTH
        stiffness = np.array([[shear * k**2, -shear * k], [-shear * k, EI * k**2 + shear]])
        inertia = np.array([M_PER_M, rotary])
        exact.append(math.sqrt(np.linalg.eigvals(stiffness / inertia[:, None]).min()))
    assert found == pytest.approx(np.array(exact) / (2 * math.pi), rel=1e-8)
