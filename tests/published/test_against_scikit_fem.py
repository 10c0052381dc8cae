"""Straight spans of the model against scikit-fem's Hermite beam element, within 0.05 %.

scikit-fem knows no shear, so the pipe is slender: L/D = 600, where shear and rotary inertia take
0.02 % of the third clamped mode, the worst of the three compared. The mesh is laid for ten times
the highest of them, so its error does not show.
"""

import math

import pytest

from fieldkit.span.layout import PointMass, Support
from fieldkit.span.pipes import PipeSection
from tests.reference.dynamic_stiffness import Attachment, Beam
from tests.reference.hermite_beam import natural_frequencies_hz
from tests.reference.spans import hold, level_span, vertical_hz

PIPE = PipeSection(0.010, 0.001)
FIRM = 1e8
"""N/m and N m/rad: millions of times the pipe's own, without strain on rounding."""
EI, MASS = 2e11 * PIPE.second_moment_m4, 7850 * PIPE.wall_area_m2
BEAM = Beam(EI, MASS)
PINNED, CLAMPED, FREE = (math.inf, 0.0), (math.inf, math.inf), (0.0, 0.0)
NAMES = {PINNED: "pinned", CLAMPED: "clamped"}
MODES = 3


def compare(length, holds, springs=(), masses=()):
    """Model against library; holds are (station, PINNED or CLAMPED), springs (station, N/m)."""
    supports = [hold(at, NAMES[kind], FIRM) for at, kind in holds]
    supports += [Support(at, "free", k, FIRM, 0.0, 0.0) for at, k in springs]
    points = tuple(PointMass(at, kg) for at, kg in masses)
    attached = [Attachment(at, *kind) for at, kind in holds]
    attached += [Attachment(at, k) for at, k in springs]
    attached += [Attachment(at, mass_kg=kg) for at, kg in masses]
    library = natural_frequencies_hz(BEAM, length, attached, MODES)
    model = vertical_hz(level_span(length, supports, points, PIPE), MODES, 10 * library[-1])
    assert model == pytest.approx(library, rel=5e-4)


@pytest.mark.parametrize(
    ("left", "right"),
    [(CLAMPED, FREE), (PINNED, PINNED), (CLAMPED, PINNED), (PINNED, CLAMPED), (CLAMPED, CLAMPED)],
)
def test_ends(left, right):
    """Five pairs of ends."""
    compare(6.0, [(at, kind) for at, kind in ((0.0, left), (6.0, right)) if kind != FREE])


@pytest.mark.parametrize("lengths", [(6.0, 6.0), (5.0, 7.0), (4.0, 6.0, 5.0), (6.0, 3.0, 6.0, 4.5)])
@pytest.mark.parametrize("ends", [(PINNED, PINNED), (CLAMPED, PINNED), (CLAMPED, CLAMPED)])
def test_several_spans(lengths, ends):
    """Equal and unequal spans over rigid supports."""
    stations = [0.0]
    for length in lengths:
        stations.append(stations[-1] + length)
    kinds = [ends[0], *[PINNED] * (len(lengths) - 1), ends[1]]
    compare(stations[-1], list(zip(stations, kinds, strict=True)))


@pytest.mark.parametrize("share", [0.1, 1.0, 10.0, 1000.0])
@pytest.mark.parametrize("at", [2.0, 3.0])
def test_spring_support(share, at):
    """A support between soft (a tenth of 48 EI/L^3) and rigid, in the middle and aside."""
    compare(6.0, [(0.0, PINNED), (6.0, CLAMPED)], springs=[(at, share * 48 * EI / 6.0**3)])


def test_on_springs_only():
    """Both ends and the middle on springs, ends free to turn."""
    k = 48 * EI / 6.0**3
    compare(6.0, [], springs=[(0.0, 3 * k), (2.5, k), (6.0, 2 * k)])


@pytest.mark.parametrize("kilograms", [0.5, 5.0, 50.0])
@pytest.mark.parametrize("at", [1.3, 3.0])
def test_point_mass(kilograms, at):
    """A valve lighter, as heavy as and ten times heavier than the pipe."""
    compare(6.0, [(0.0, CLAMPED), (6.0, PINNED)], masses=[(at, kilograms)])


def test_everything_at_once():
    """Overhang, unequal spans, a soft support and two masses."""
    k = 48 * EI / 5.0**3
    holds = [(1.0, PINNED), (6.0, PINNED), (13.0, CLAMPED)]
    compare(13.0, holds, springs=[(9.0, 2 * k)], masses=[(0.0, 0.8), (7.7, 3.0)])
