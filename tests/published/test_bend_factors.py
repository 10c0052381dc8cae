"""Factors F of bent spans, both ends clamped: f = F/(2 pi L^2) sqrt(EI/m).

Published: Wachel, Morton & Atkins 1990, Proc. 19th Turbomachinery Symposium, pp. 119-134, from
memory. Computed: sharp rigid corners, inextensible legs, Poisson ratio 0.3, in an independent
calculation.
"""

import pytest

from fieldkit.span.bend_factors import (
    IN_PLANE,
    LEG_RATIOS,
    OUT_OF_PLANE,
    PUBLISHED_EQUAL_LEGS,
    bend_factor,
)
from tests.reference.rigid_corner_frame import factors, legs

PUBLISHED = {
    # shape: out of plane, in plane, first mode (from memory)
    "L": (16.5, 59.4),
    "U": (18.7, 23.7),
    "Z": (23.4, 22.4),
    "3-D": (20.6, None),
}
SHARP_CORNERS = {
    # leg ratio: first factor of L out, L in, U out, U in, Z out, Z in, 3-D (computed)
    0.10: (22.98, 25.89, 23.33, 29.50, 23.37, 24.70, 24.01),
    0.25: (24.40, 31.81, 25.91, 41.77, 26.84, 29.49, 27.59),
    0.50: (20.02, 43.08, 22.93, 36.68, 26.74, 28.75, 25.29),
    0.75: (17.08, 54.97, 19.77, 31.35, 24.84, 26.15, 21.97),
    1.00: (16.41, 61.67, 17.99, 28.84, 23.65, 24.71, 20.09),
    1.50: (None, None, 16.25, 26.49, 22.58, 23.44, 18.34),
    2.00: (None, None, 15.47, 25.38, 22.20, 22.95, 17.60),
    3.00: (None, None, 14.79, 24.32, 22.01, 22.59, 17.00),
}
COLUMNS = (
    OUT_OF_PLANE["L"], IN_PLANE["L"], OUT_OF_PLANE["U"], IN_PLANE["U"], OUT_OF_PLANE["Z"],
    IN_PLANE["Z"], OUT_OF_PLANE["3-D"],
)  # fmt: skip


def test_equal_legs_are_the_published_ones():
    """Within a tenth of equal legs the published factor is used, and named from memory."""
    for shape, (out_of_plane, in_plane) in PUBLISHED.items():
        for ratio in (0.95, 1.0, 1.05):
            found = bend_factor(shape, ratio)
            assert (found.out_of_plane, found.in_plane) == (out_of_plane, in_plane)
            assert "Wachel" in found.source
            assert "from memory" in found.source


@pytest.mark.parametrize("ratio", SHARP_CORNERS)
def test_computed_columns(ratio):
    """Every entry of the first mode for sharp corners, to its printed figures."""
    row = LEG_RATIOS.index(ratio)
    for column, printed in zip(COLUMNS, SHARP_CORNERS[ratio], strict=True):
        if printed is not None:
            assert column[row] == pytest.approx(printed, abs=0.02)


@pytest.mark.parametrize("shape", PUBLISHED)
def test_lowest_published_factor_is_near_sharp_corners(shape):
    """The remembered table hangs together with beam theory: the lowest factor within 6 %."""
    sharp = factors(legs(shape, 1.0), count=1)[0]
    assert PUBLISHED_EQUAL_LEGS[shape].lowest == pytest.approx(sharp, rel=0.06)


def test_equal_l_is_two_beams_of_half_length():
    """In plane an inextensible equal L is a clamped-pinned, then a clamped beam of half length."""
    found = factors(legs("L", 1.0), "in", count=2)
    assert found == pytest.approx([61.673, 89.493], abs=0.01)
