"""Rolled sections for brackets: dimensions from the standards, properties computed from them.

Dimensions (facts of the standards, from memory): equal angles EN 10056-1, tapered channels EN 10279
(UPN), square hollow sections EN 10219-2 with its nominal corner radii, equal angles ASTM A6.
Areas and second moments are computed: angles with root and toe radii, hollow sections with round
corners, channels with the taper of their flanges (8 % about the nominal thickness at half their
width) and sharp corners, A6 angles sharp.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cache
from itertools import pairwise

EN_ANGLE, EN_CHANNEL, EN_HOLLOW = "EN 10056-1", "EN 10279", "EN 10219-2"
A6_ANGLE = "ASTM A6"
STEEL_DENSITY_KG_PER_M3 = 7850.0
INCH_M = 0.0254
TAPER = 0.08
_STRIPS = 20


@dataclass(frozen=True)
class Section:
    """One rolled section, SI; ``bending`` is in the plane a bracket is loaded in."""

    name: str
    standard: str
    form: str
    """``angle``, ``channel`` or ``hollow``."""
    depth_m: float
    area_m2: float
    major_m4: float
    """About the axis through the centroid parallel to a leg, or the strong axis."""
    minor_m4: float
    """About the weak axis: the weak principal one of an angle."""
    bending_m4: float
    """What resists a load across the bracket: of an angle that may twist aside less than
    ``major_m4``, of the others the same."""
    shear_m2: float

    @property
    def mass_kg_per_m(self) -> float:
        """Of the area at the density of steel."""
        return self.area_m2 * STEEL_DENSITY_KG_PER_M3

    @property
    def least_radius_m(self) -> float:
        """Least radius of gyration."""
        return math.sqrt(self.minor_m4 / self.area_m2)


@dataclass(frozen=True)
class _Moments:
    """Integrals of 1, x, y, x^2, y^2, x y over an area."""

    a: float
    x: float
    y: float
    xx: float
    yy: float
    xy: float

    def __add__(self, other: _Moments) -> _Moments:
        return _Moments(*(p + q for p, q in zip(self._all, other._all, strict=True)))

    def __sub__(self, other: _Moments) -> _Moments:
        return _Moments(*(p - q for p, q in zip(self._all, other._all, strict=True)))

    @property
    def _all(self) -> tuple[float, ...]:
        return (self.a, self.x, self.y, self.xx, self.yy, self.xy)

    def about_centroid(self) -> tuple[float, float, float]:
        """(integral of y^2, of x^2, of x y) about the centroid."""
        return (
            self.yy - self.y**2 / self.a,
            self.xx - self.x**2 / self.a,
            self.xy - self.x * self.y / self.a,
        )


def _rectangle(x0: float, x1: float, y0: float, y1: float) -> _Moments:
    a, cx, cy = (x1 - x0) * (y1 - y0), 0.5 * (x0 + x1), 0.5 * (y0 + y1)
    return _Moments(
        a, a * cx, a * cy,
        a * (cx**2 + (x1 - x0) ** 2 / 12), a * (cy**2 + (y1 - y0) ** 2 / 12), a * cx * cy,
    )  # fmt: skip


def _corner(x0: float, y0: float, sx: int, sy: int, r: float) -> _Moments:
    """Between a square corner at (x0, y0), opening along (sx, sy), and its inscribed quarter
    circle of radius r."""
    a = (1 - math.pi / 4) * r**2
    first = (5 / 6 - math.pi / 4) * r**3
    second = (1 - 5 * math.pi / 16) * r**4
    product = (19 / 24 - math.pi / 4) * r**4
    return _Moments(
        a,
        a * x0 + sx * first,
        a * y0 + sy * first,
        a * x0**2 + 2 * x0 * sx * first + second,
        a * y0**2 + 2 * y0 * sy * first + second,
        a * x0 * y0 + x0 * sy * first + y0 * sx * first + sx * sy * product,
    )


def equal_angle(
    name: str, standard: str, leg: float, thickness: float, root: float = 0.0, toe: float = 0.0
) -> Section:
    """An equal angle from leg, thickness, root and toe radius, metres."""
    t = thickness
    whole = _rectangle(0, leg, 0, t) + _rectangle(0, t, t, leg)
    whole = whole + _corner(t, t, 1, 1, root)
    whole = whole - _corner(leg, t, -1, -1, toe) - _corner(t, leg, -1, -1, toe)
    major, _, product = whole.about_centroid()
    strong, weak = major + abs(product), major - abs(product)
    free = 2 * strong * weak / (strong + weak)
    return Section(name, standard, "angle", leg, whole.a, major, weak, free, 5 / 6 * leg * t)


def channel(name: str, standard: str, h: float, b: float, web: float, flange: float) -> Section:
    """A tapered channel from depth, width, web and flange thickness at half its width, metres."""
    whole = _rectangle(0, web, 0, h)
    edges = [web + (b - web) * i / _STRIPS for i in range(_STRIPS + 1)]
    for x0, x1 in pairwise(edges):
        t = flange + TAPER * (b / 2 - (x0 + x1) / 2)
        whole = whole + _rectangle(x0, x1, 0, t) + _rectangle(x0, x1, h - t, h)
    strong, weak, _ = whole.about_centroid()
    return Section(name, standard, "channel", h, whole.a, strong, weak, strong, web * h)


def square_hollow(name: str, standard: str, b: float, t: float) -> Section:
    """A cold-formed square hollow section; corner radii as EN 10219-2 takes them (up to 6 mm wall:
    2 t outside, t inside; up to 10 mm 2.5 t and 1.5 t)."""
    outside, inside = (2 * t, t) if t <= 6e-3 else (2.5 * t, 1.5 * t)
    whole = _rounded_square(b, outside) - _rounded_square(b - 2 * t, inside)
    second = whole.about_centroid()[0]
    return Section(name, standard, "hollow", b, whole.a, second, second, second, whole.a / 2)


def _rounded_square(b: float, radius: float) -> _Moments:
    half = b / 2
    whole = _rectangle(-half, half, -half, half)
    for sx in (1, -1):
        for sy in (1, -1):
            whole = whole - _corner(-sx * half, -sy * half, sx, sy, radius)
    return whole


_ANGLES_MM = (
    # leg, thickness, root radius, toe radius (half the root radius)
    (50, 5, 7), (60, 6, 8), (70, 7, 9), (80, 8, 10), (100, 10, 12), (120, 12, 13), (150, 15, 16),
)  # fmt: skip
_CHANNELS_MM = (
    # depth, width, web, mean flange
    (80, 45, 6, 8), (100, 50, 6, 8.5), (120, 55, 7, 9), (140, 60, 7, 10), (160, 65, 7.5, 10.5),
    (200, 75, 8.5, 11.5),
)  # fmt: skip
_HOLLOWS_MM = ((50, 4), (60, 4), (80, 5), (100, 5), (100, 6), (120, 6), (150, 6))
_A6_ANGLES_IN = ((2, 1 / 4, "1/4"), (2.5, 5 / 16, "5/16"), (3, 3 / 8, "3/8"), (4, 3 / 8, "3/8"),
                 (4, 1 / 2, "1/2"), (6, 1 / 2, "1/2"))  # fmt: skip


@cache
def sections(units: str = "SI") -> tuple[Section, ...]:
    """Every section in the table; A6 angles in place of the European ones where units are US."""
    mm = 1e-3
    angles = [
        equal_angle(f"L{a}x{a}x{t}", EN_ANGLE, a * mm, t * mm, r * mm, r * mm / 2)
        for a, t, r in _ANGLES_MM
    ]
    if units == "US":
        angles = [
            equal_angle(f"L{a:g}x{a:g}x{shown}", A6_ANGLE, a * INCH_M, t * INCH_M)
            for a, t, shown in _A6_ANGLES_IN
        ]
    channels = [
        channel(f"UPN {h}", EN_CHANNEL, h * mm, b * mm, w * mm, f * mm)
        for h, b, w, f in _CHANNELS_MM
    ]
    hollows = [square_hollow(f"SHS {b}x{b}x{t}", EN_HOLLOW, b * mm, t * mm) for b, t in _HOLLOWS_MM]
    return (*angles, *channels, *hollows)
