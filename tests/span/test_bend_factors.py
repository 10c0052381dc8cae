"""Looking up and interpolating the factors of bent spans."""

import numpy as np
import pytest

from fieldkit.span.bend_factors import IN_PLANE, LEG_RATIOS, OUT_OF_PLANE, bend_factor
from tests.reference.rigid_corner_frame import factors, legs

PLANES = (("out", OUT_OF_PLANE), ("in", IN_PLANE))
COLUMNS = [(plane, shape) for plane, table in PLANES for shape in table]


@pytest.mark.parametrize(("plane", "shape"), COLUMNS)
def test_table_is_what_the_frame_gives(plane, shape):
    """Every second entry recomputed by a frame of rigid corners, to the two decimals held."""
    column = dict(PLANES)[plane][shape]
    motion = "any" if shape == "3-D" else plane
    for ratio, held in list(zip(LEG_RATIOS, column, strict=False))[1::2]:
        assert factors(legs(shape, ratio), motion, count=1)[0] == pytest.approx(held, abs=0.006)


@pytest.mark.parametrize("shape", OUT_OF_PLANE)
@pytest.mark.parametrize("ratio", [0.03, 0.22, 0.45, 0.8])
def test_between_entries_the_lowest_factor_holds_within_two_percent(shape, ratio):
    """Straight-line interpolation over the leg ratio."""
    lowest = factors(legs(shape, ratio), count=1)[0]
    assert bend_factor(shape, ratio).lowest == pytest.approx(lowest, rel=0.02)


def test_an_l_reads_the_same_from_either_end():
    """Which leg comes first does not matter."""
    assert bend_factor("L", 0.4) == bend_factor("L", 2.5)


def test_outside_the_table_there_is_none():
    """No extrapolation."""
    assert bend_factor("U", 3.2) is None
    assert bend_factor("Z", -0.1) is None


def test_a_vanishing_leg_leaves_a_straight_span():
    """All shapes begin at the clamped beam's 22.37."""
    found = [bend_factor(shape, 0.0).lowest for shape in OUT_OF_PLANE]
    assert found == pytest.approx([22.373] * 4, abs=0.005)
    assert np.all(np.diff(LEG_RATIOS) > 0)
