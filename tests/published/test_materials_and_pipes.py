"""Modulus against temperature, pipe dimensions and a mass by hand."""

import pytest

from fieldkit.span.materials import material
from fieldkit.span.pipes import PipeSection, standard_pipe

FAHRENHEIT = (70, 200, 300, 400, 500, 600, 700, 800, 900, 1000)
MODULUS = {
    # 10^6 psi; ASME B31.1-1995 through an open engineering table
    "carbon steel": (29.5, 28.8, 28.3, 27.7, 27.3, 26.7, 25.5, 24.2, 22.4, 20.4),
    "stainless steel 304": (28.3, 27.6, 27.0, 26.5, 25.8, 25.3, 24.8, 24.1, 23.5, 22.8),
    "stainless steel 316": (28.3, 27.6, 27.0, 26.5, 25.8, 25.3, 24.8, 24.1, 23.5, 22.8),
    "1.25Cr-0.5Mo steel": (29.7, 29.0, 28.5, 27.9, 27.5, 26.9, 26.3, 25.5, 24.8, 23.9),
    "2.25Cr-1Mo steel": (30.6, 29.8, 29.4, 28.8, 28.3, 27.7, 27.1, 26.3, 25.6, 24.6),
}
CARBON_GPA = (203.4, 198.6, 195.1, 191.0, 188.2, 184.1, 175.8, 166.9, 154.4, 140.7)
"""The carbon steel row as printed in a second open table."""
CARBON_BETWEEN = {
    100: (198.1, 0.987), 200: (191.3, 0.970), 300: (185.3, 0.954), 400: (171.2, 0.917),
}  # fmt: skip
"""degC: GPa by linear interpolation, and frequency over that at 21 degC (computed)."""

DIMENSIONS = (
    # NPS, schedule, outside diameter, wall in mm; ASME B36.10M/B36.19M (from memory)
    ("1/2", "40", 21.3, 2.77), ("3/4", "80", 26.7, 3.91), ("1", "160", 33.4, 6.35),
    ("2", "80", 60.3, 5.54), ("2", "10S", 60.3, 2.77), ("2", "5S", 60.3, 1.65),
    ("3", "XXS", 88.9, 15.24), ("4", "10", 114.3, 3.05), ("4", "40", 114.3, 6.02),
    ("6", "80", 168.3, 10.97), ("6", "120", 168.3, 14.27), ("8", "20", 219.1, 6.35),
    ("8", "XXS", 219.1, 22.23), ("10", "60", 273.0, 12.70), ("10", "40S", 273.1, 9.27),
    ("12", "STD", 323.8, 9.53), ("12", "40", 323.8, 10.31), ("16", "30", 406.4, 9.53),
    ("24", "40", 610.0, 17.48), ("24", "160", 610.0, 59.54),
)  # fmt: skip


def kelvin(fahrenheit):
    return (fahrenheit - 32) / 1.8 + 273.15


@pytest.mark.parametrize("name", MODULUS)
def test_modulus_table(name):
    """Every printed temperature of five steels."""
    found = [material(name).modulus_at(kelvin(f)) / 6.894757293e9 for f in FAHRENHEIT]
    assert found == pytest.approx(MODULUS[name], rel=1e-6)


def test_second_open_table():
    """The carbon steel row in GPa, to its four figures."""
    found = [material("carbon steel").modulus_at(kelvin(f)) / 1e9 for f in FAHRENHEIT]
    assert found == pytest.approx(CARBON_GPA, abs=0.06)


@pytest.mark.parametrize("celsius", CARBON_BETWEEN)
def test_modulus_between(celsius):
    """Linear interpolation, and what it does to a frequency."""
    gpa, ratio = CARBON_BETWEEN[celsius]
    steel = material("carbon steel")
    hot, cold = (steel.modulus_at(t + 273.15) for t in (celsius, 21.0))
    assert hot / 1e9 == pytest.approx(gpa, abs=0.06)
    assert (hot / cold) ** 0.5 == pytest.approx(ratio, abs=6e-4)


@pytest.mark.parametrize(("size", "schedule", "diameter", "wall"), DIMENSIONS)
def test_dimensions(size, schedule, diameter, wall):
    """Twenty sampled pipes to 0.01 mm."""
    pipe = standard_pipe(f"NPS {size}", schedule)
    assert pipe.outside_diameter_m * 1e3 == pytest.approx(diameter, abs=0.005)
    assert pipe.wall_m * 1e3 == pytest.approx(wall, abs=0.005)


def test_section_by_hand():
    """NPS 4 Sch 40, steel 7850, water 1000: A, I and mass per metre worked by hand."""
    pipe = PipeSection(0.1143, 0.00602)
    assert pipe.wall_area_m2 == pytest.approx(2.04783e-3, rel=3e-6)
    assert pipe.second_moment_m4 == pytest.approx(3.01052e-6, rel=3e-6)
    mass = 7850 * pipe.wall_area_m2 + 1000 * pipe.bore_area_m2
    assert mass == pytest.approx(24.2885, rel=3e-6)
