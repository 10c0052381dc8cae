"""Random straight lines on springs, with masses, and how far the span model is from exact."""

from __future__ import annotations

import math
import random

import numpy as np

from fieldkit.span.elements import cowper_shear_coefficient
from fieldkit.span.layout import PointMass, Span, State, Support
from fieldkit.span.modes import span_modes
from fieldkit.span.pipes import PipeSection
from tests.reference.dynamic_stiffness import Attachment, Beam, natural_frequencies_hz
from tests.reference.spans import STEEL, frequencies_hz, level_span

PIPES = (
    # outside diameter and wall in mm: NPS 3/4 sch 80 to NPS 12 STD
    (26.7, 3.91), (60.3, 3.91), (88.9, 5.49), (114.3, 6.02), (168.3, 7.11), (323.8, 9.53),
)  # fmt: skip
WATER = 998.0
MODES = 5


def random_line(rng: random.Random) -> tuple[Span, State, Beam, list[Attachment]]:
    """A pipe on two to five supports of any stiffness, with none to three masses."""
    diameter, wall = rng.choice(PIPES)
    pipe = PipeSection(diameter / 1e3, wall / 1e3)
    length = pipe.outside_diameter_m * rng.uniform(15, 150)
    fill = rng.choice([0.0, 0.5, 1.0])
    own = 48 * 2e11 * pipe.second_moment_m4 / length**3
    stations = sorted({0.0, length, *(rng.uniform(0.1, 0.9) * length for _ in range(3))})
    held = [stations[0], stations[-1], *rng.sample(stations[1:-1], rng.randint(0, 3))]
    springs = [
        (at, own * 10 ** rng.uniform(0, 4), rng.choice([0.0, own * length**2 * rng.uniform(0, 1)]))
        for at in held
    ]
    mass_per_m = 7850 * pipe.wall_area_m2 + fill * WATER * pipe.bore_area_m2
    masses = [
        (rng.uniform(0, length), rng.uniform(0.05, 1.0) * mass_per_m * length)
        for _ in range(rng.randint(0, 3))
    ]
    supports = [Support(at, "free", k, math.inf, math.inf, turn) for at, k, turn in springs]
    points = tuple(PointMass(at, kg) for at, kg in masses)
    bare = level_span(length, supports, points, pipe)
    span = Span(pipe, STEEL, bare.legs, bare.supports, points, WATER)
    kappa = cowper_shear_coefficient(pipe.bore_m / pipe.outside_diameter_m, 0.3)
    beam = Beam(
        2e11 * pipe.second_moment_m4,
        mass_per_m,
        kappa * 2e11 / 2.6 * pipe.wall_area_m2,
        7850 * pipe.second_moment_m4,
    )
    attached = [Attachment(at, k, turn) for at, k, turn in springs]
    attached += [Attachment(at, mass_kg=kg) for at, kg in masses]
    return span, State("tapped", fill=(fill, fill)), beam, attached


def relative_errors(span: Span, state: State, beam: Beam, attached: list[Attachment]) -> np.ndarray:
    """(MODES,) of the first vertical modes, asked for up to just above the last."""
    exact = natural_frequencies_hz(beam, span.length_m, attached, MODES)
    modes = span_modes(span, state, 1.02 * exact[-1])
    return frequencies_hz(modes, "vertical", MODES) / exact - 1
