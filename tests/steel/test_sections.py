"""Computed properties against the published tables of the standards (values from memory)."""

import pytest

from fieldkit.steel.sections import sections

PUBLISHED = {
    # area cm2, strong (or leg-parallel) cm4, weak cm4
    "L50x50x5": (4.80, 11.0, 4.55),
    "L60x60x6": (6.91, 22.8, 9.44),
    "L70x70x7": (9.40, 42.3, 17.5),
    "L80x80x8": (12.3, 72.2, 29.9),
    "L100x100x10": (19.2, 177, 73.0),
    "L120x120x12": (27.5, 368, 152),
    "L150x150x15": (43.0, 898, 370),
    "SHS 50x50x4": (6.95, 23.7, 23.7),
    "SHS 60x60x4": (8.55, 43.6, 43.6),
    "SHS 80x80x5": (14.4, 131, 131),
    "SHS 100x100x5": (18.4, 271, 271),
    "SHS 100x100x6": (21.6, 311, 311),
    "SHS 120x120x6": (26.4, 562, 562),
    "SHS 150x150x6": (33.6, 1146, 1146),
}
CHANNELS = {
    "UPN 80": (11.0, 106, 19.4),
    "UPN 100": (13.5, 206, 29.3),
    "UPN 120": (17.0, 364, 43.2),
    "UPN 140": (20.4, 605, 62.7),
    "UPN 160": (24.0, 925, 85.3),
    "UPN 200": (32.2, 1910, 148),
}
A6_IN = {"L2x2x1/4": (0.944, 0.346), "L3x3x3/8": (2.11, 1.75), "L4x4x3/8": (2.86, 4.32)}


def named(name, units="SI"):
    return next(s for s in sections(units) if s.name == name)


@pytest.mark.parametrize("name", PUBLISHED)
def test_angles_and_hollow_sections_to_half_a_per_cent(name):
    """EN 10056-1 and EN 10219-2 print three digits."""
    found = named(name)
    area, strong, weak = PUBLISHED[name]
    assert found.area_m2 * 1e4 == pytest.approx(area, rel=5e-3)
    assert found.major_m4 * 1e8 == pytest.approx(strong, rel=5e-3)
    assert found.minor_m4 * 1e8 == pytest.approx(weak, rel=5e-3)


@pytest.mark.parametrize("name", CHANNELS)
def test_channels_with_sharp_corners(name):
    """Root and toe radii left out: 2 % in area and strong axis, 7 % in the weak one."""
    found = named(name)
    area, strong, weak = CHANNELS[name]
    assert found.area_m2 * 1e4 == pytest.approx(area, rel=0.02)
    assert found.major_m4 * 1e8 == pytest.approx(strong, rel=0.02)
    assert found.minor_m4 * 1e8 == pytest.approx(weak, rel=0.07)


@pytest.mark.parametrize("name", A6_IN)
def test_american_angles_without_fillet(name):
    """ASTM A6 sizes as the American steel manual lists them, in2 and in4; sharp corners, 3.5 %."""
    found = named(name, "US")
    area, strong = A6_IN[name]
    assert found.area_m2 / 0.0254**2 == pytest.approx(area, rel=0.025)
    assert found.major_m4 / 0.0254**4 == pytest.approx(strong, rel=0.035)


def test_an_angle_that_may_move_aside_is_softer_than_its_table_value():
    """Compliance along a leg is the mean of the two principal ones (unsymmetrical bending)."""
    angle = named("L100x100x10")
    strong = 2 * angle.major_m4 - angle.minor_m4
    mean = 0.5 * (1 / strong + 1 / angle.minor_m4)
    assert angle.bending_m4 == pytest.approx(1 / mean)
    assert angle.bending_m4 < 0.7 * angle.major_m4
