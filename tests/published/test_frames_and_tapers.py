"""Two answers of frame programs that the elements give too: a double portal, tapered cantilevers.

Guide de validation des progiciels de calcul de structures, AFNOR/SFM 1990, SDLX01 and SDLL09, as
quoted in a public verification report. No pipe looks so; the elements alone are put together here.
"""

import math

import numpy as np
import pytest

from fieldkit.span.elements import ElementSet, local_axes, mass, stiffness
from tests.reference.element_chain import RY, RZ, SLENDER, UX, UY, UZ, frequencies_hz, joined, kept

PORTAL = (8.8, 29.4, 43.8, 56.3, 96.2, 102.6, 147.1, 174.8, 178.8, 206.0, 266.4, 320.0, 335.0)
TAPERS = {
    # width at the root (mm), 40 mm thick there, 10 x 10 mm at the tip: the first five (Hz)
    40: (54.18, 171.94, 384.40, 697.24, 1112.28),
    50: (56.55, 175.79, 389.01, 702.36, 1117.63),
}
DENSITY = 7800.0


def members(start_m, end_m, modulus_pa, area_m2, second_moment_m4):
    """Slender elements between rows of points (E, 3), with sections (E,)."""
    along = end_m - start_m
    length = np.linalg.norm(along, axis=1)
    one = np.ones(len(length))
    return ElementSet(
        length_m=length,
        axes=local_axes(along / length[:, None]),
        offset_m=np.zeros((len(length), 3)),
        axial_rigidity_n=one * modulus_pa * area_m2,
        bending_rigidity_n_m2=one * modulus_pa * second_moment_m4,
        torsional_rigidity_n_m2=one,
        shear_rigidity_n=one * SLENDER,
        mass_kg_per_m=one * DENSITY * area_m2,
        rotary_inertia_kg_m=0 * one,
    )


def portal_lines():
    """Legs 0.81 m high and 0.60 m apart, bars at 0.36 and 0.81 m; six elements a bar or so."""
    feet, low, high = 0.0, 0.36, 0.81
    for x in (0.0, 0.6):
        yield (x, feet), (x, low), 6
        yield (x, low), (x, high), 8
    for z in (low, high):
        yield (0.0, z), (0.6, z), 10


def test_double_portal():
    """SDLX01: section 29 x 4.8 mm bent the thin way in its plane, 210 GPa: 13 modes, 0.3 %."""
    cuts = [
        np.linspace(a, b, count + 1).round(9)[step : step + 2]
        for a, b, count in portal_lines()
        for step in range(count)
    ]
    points = sorted({tuple(end) for cut in cuts for end in cut})
    number = {point: i for i, point in enumerate(points)}
    start, end = np.array(cuts)[:, 0], np.array(cuts)[:, 1]
    bars = members(
        np.insert(start, 1, 0.0, axis=1),
        np.insert(end, 1, 0.0, axis=1),
        210e9,
        29e-3 * 4.8e-3,
        29e-3 * 4.8e-3**3 / 12,
    )
    k, m = np.zeros((2, 6 * len(points), 6 * len(points)))
    for cut, stiff, heavy in zip(cuts, stiffness(bars), mass(bars), strict=True):
        dofs = np.concatenate([6 * number[tuple(node)] + np.arange(6) for node in cut])
        k[np.ix_(dofs, dofs)] += stiff
        m[np.ix_(dofs, dofs)] += heavy
    feet = [(i, motion) for (_, z), i in number.items() if z == 0 for motion in (UX, UZ, RY)]
    found = frequencies_hz(k, m, kept(len(k), (UX, UZ, RY), feet), len(PORTAL))
    assert found == pytest.approx(PORTAL, rel=3e-3)


@pytest.mark.parametrize("width_mm", TAPERS)
def test_tapered_cantilever(width_mm):
    """SDLL09: 1 m, 200 GPa, moving in the 40 mm thickness, 80 steps: five modes within 0.1 %."""
    steps = 80
    station = np.linspace(0.0, 1.0, steps + 1)
    middle = (station[:-1] + station[1:]) / 2
    thickness = 0.040 + (0.010 - 0.040) * middle
    width = width_mm / 1e3 + (0.010 - width_mm / 1e3) * middle
    points = np.stack([station, 0 * station, 0 * station], axis=1)
    bar = members(points[:-1], points[1:], 200e9, width * thickness, width * thickness**3 / 12)
    k, m = joined(stiffness(bar)), joined(mass(bar))
    mask = kept(len(k), (UY, RZ), [(0, UY), (0, RZ)])
    found = frequencies_hz(k, m, mask, 5)
    assert found == pytest.approx(TAPERS[width_mm], rel=1e-3)


def test_uniform_bar_is_the_slender_one():
    """What is put together here gives the well-known 3.5160 of a uniform cantilever."""
    points = np.stack([np.linspace(0, 1, 21), *np.zeros((2, 21))], axis=1)
    bar = members(points[:-1], points[1:], 200e9, 1e-4, 1e-8 / 12)
    mask = kept(6 * 21, (UY, RZ), [(0, UY), (0, RZ)])
    found = frequencies_hz(joined(stiffness(bar)), joined(mass(bar)), mask, 1)[0]
    unit = math.sqrt(200e9 * 1e-8 / 12 / (DENSITY * 1e-4)) / (2 * math.pi)
    assert found / unit == pytest.approx(3.5160, abs=1e-4)
