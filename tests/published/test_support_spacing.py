"""Suggested spacing against the printed tables, in feet, metres and hertz.

Feet and metres: ASME B31.1 / MSS SP-69 as in a piping handbook, table B5.1; sizes without metres
from an open table adapted from SP-69. Hertz: first pinned mode at that spacing, computed with
E = 203.4 GPa, 7850 kg/m^3, standard wall, water 1000 kg/m^3 or empty.
"""

import math

import pytest

from fieldkit.span import eigenvalues
from fieldkit.span.pipes import PipeSection
from fieldkit.span.spacing import suggested_spacing_m

PRINTED = {
    # NPS: water ft, gas ft
    "1/2": (7, 8), "3/4": (7, 9), "1": (7, 9), "1-1/2": (9, 12), "2": (10, 13), "2-1/2": (11, 14),
    "3": (12, 15), "4": (14, 17), "6": (17, 21), "8": (19, 24), "10": (20, 26), "12": (23, 30),
    "14": (25, 32), "16": (27, 35), "18": (28, 37), "20": (30, 39), "24": (32, 42),
}  # fmt: skip
METRES = {
    "1": (2.13, 2.74), "2": (3.05, 3.96), "3": (3.66, 4.57), "4": (4.27, 5.18), "6": (5.18, 6.40),
    "8": (5.79, 7.32), "12": (7.01, 9.14), "16": (8.23, 10.7), "20": (9.14, 11.9),
    "24": (9.75, 12.8),
}  # fmt: skip
FIRST_MODE = {
    # NPS: outside diameter and standard wall in mm; Hz at the water and at the gas spacing
    "1": (33.4, 3.38, 17.0, 11.4),
    "2": (60.3, 3.91, 14.6, 10.2),
    "3": (88.9, 5.49, 14.8, 11.3),
    "4": (114.3, 6.02, 13.7, 11.4),
    "6": (168.3, 7.11, 13.2, 11.1),
    "8": (219.1, 8.18, 13.4, 11.2),
    "12": (323.8, 9.53, 12.8, 10.6),
    "16": (406.4, 9.53, 11.0, 9.9),
    "20": (508.0, 9.53, 10.5, 10.0),
    "24": (610.0, 9.53, 10.4, 10.4),
}


@pytest.mark.parametrize("size", PRINTED)
def test_feet(size):
    """All seventeen sizes."""
    found = suggested_spacing_m(f"NPS {size}")
    assert (found.water_m / 0.3048, found.gas_m / 0.3048) == pytest.approx(PRINTED[size])


@pytest.mark.parametrize("size", METRES)
def test_metres(size):
    """The metric columns, rounded as printed."""
    found = suggested_spacing_m(size)
    for metres, printed in zip((found.water_m, found.gas_m), METRES[size], strict=True):
        assert round(metres, 1 if printed > 10 else 2) == printed


@pytest.mark.parametrize("size", FIRST_MODE)
def test_spacing_is_a_sag_rule(size):
    """First pinned modes at the suggested spacing, 10 to 17 Hz."""
    diameter, wall, water_hz, empty_hz = FIRST_MODE[size]
    pipe = PipeSection(diameter / 1e3, wall / 1e3)
    spacing = suggested_spacing_m(size)
    steel = 7850 * pipe.wall_area_m2
    for length, mass, printed in (
        (spacing.water_m, steel + 1000 * pipe.bore_area_m2, water_hz),
        (spacing.gas_m, steel, empty_hz),
    ):
        found = eigenvalues.frequency_hz(math.pi, length, 203.4e9 * pipe.second_moment_m4, mass)
        assert found == pytest.approx(printed, abs=0.06)
