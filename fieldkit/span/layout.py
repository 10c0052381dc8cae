"""A pipe span as it is described: legs, supports, masses and the state it is in.

Pure description, SI units, z up. Stations run along the corner-to-corner line of the legs, the
line a tape follows on site and a drawing is dimensioned by; a bend of radius R replaces the last
R tan(a/2) before a corner and the first after it by an arc, and stations inside that stretch
advance evenly along the arc.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import InputError, Place
from fieldkit.span.materials import Material
from fieldkit.span.pipes import PipeSection

Vector = tuple[float, float, float]


@dataclass(frozen=True)
class Believed:
    """A stiffness that somebody has reason to expect, with how sure of it one may be."""

    median: float
    """N/m (N m/rad for rotation)."""
    sd_ln: float
    """Standard deviation of the natural logarithm."""


Stiffness = float | Believed | Literal["implied", "unknown"]
"""N/m (N m/rad for rotation); ``math.inf`` is rigid, 0 is free; ``implied`` is what the kind of
support implies and ``unknown`` the same with a wider doubt."""

AXES = ("vertical", "lateral", "axial", "rotation", "x", "y", "z")
END_TOLERANCE_M = 1e-6


@dataclass(frozen=True)
class Leg:
    """One straight run from corner to corner; a bend joins it to the leg before."""

    direction: Vector
    """Unit vector."""
    length_m: float
    bend_radius_m: float | None = None
    """Centre-line radius of the bend at this leg's start; None for the first leg."""


@dataclass(frozen=True)
class Support:
    """Something that holds the pipe at a station."""

    at_m: float
    kind: str
    vertical: Stiffness = "implied"
    lateral: Stiffness = "implied"
    axial: Stiffness = "implied"
    rotation: Stiffness = "implied"
    x: Stiffness = "implied"
    y: Stiffness = "implied"
    z: Stiffness = "implied"
    torsion: Stiffness = "implied"
    """About the pipe's own axis; implied by the grip, not written in a job file."""
    header: PipeSection | None = None
    """The pipe that a ``branch`` is welded to, where its size is known."""


@dataclass(frozen=True)
class PointMass:
    """A valve, flange or actuator; its centre of gravity may stand off the centre line."""

    at_m: float
    mass_kg: float
    name: str = "mass"
    tolerance: float = 0.1
    """Relative, one standard deviation."""
    offset_m: Vector = (0.0, 0.0, 0.0)
    """Global x, y, z from the centre line to the centre of gravity."""


@dataclass(frozen=True)
class Insulation:
    """A layer around the pipe that adds mass and no stiffness."""

    thickness_m: float
    density_kg_per_m3: float


@dataclass(frozen=True)
class State:
    """What differs between the span as tapped and as running."""

    name: str
    fill: tuple[float, float] = (1.0, 1.0)
    """Lowest and highest possible filled fraction of the bore; equal when it is known."""
    temperature_k: float = 293.15
    pressure_pa: float = 0.0
    """Gauge."""

    @property
    def nominal_fill(self) -> float:
        """Middle of the possible range."""
        return 0.5 * (self.fill[0] + self.fill[1])


@dataclass(frozen=True)
class Span:
    """The pipe between the ends that matter."""

    pipe: PipeSection
    material: Material
    legs: tuple[Leg, ...]
    supports: tuple[Support, ...] = ()
    masses: tuple[PointMass, ...] = ()
    contents_density_kg_per_m3: float = 0.0
    insulation: Insulation | None = None

    def __post_init__(self) -> None:
        _check(self)

    @property
    def length_m(self) -> float:
        """Sum of the legs, corner to corner: the last station."""
        return float(sum(leg.length_m for leg in self.legs))

    @cached_property
    def centre_line(self) -> CentreLine:
        """Where each station lies in space."""
        return CentreLine.through(self.legs)


@dataclass(frozen=True)
class Piece:
    """A stretch of centre line between two stations: straight, or an arc about ``centre``."""

    start_m: float
    end_m: float
    start: NDArray[np.float64]
    tangent: NDArray[np.float64]
    """Unit tangent at the start."""
    centre: NDArray[np.float64] | None = None
    angle_rad: float = 0.0
    """Angle the arc turns through; 0 for a straight piece."""
    radius_m: float = math.inf

    @property
    def arc_length_m(self) -> float:
        """True length along the centre line (shorter than the station difference on an arc)."""
        if self.centre is None:
            return self.end_m - self.start_m
        return self.radius_m * self.angle_rad

    def at(self, station_m: float) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Position and unit tangent at a station inside this piece."""
        if self.centre is None:
            return self.start + (station_m - self.start_m) * self.tangent, self.tangent
        share = (station_m - self.start_m) / (self.end_m - self.start_m)
        turn = self.angle_rad * share
        outward = (self.start - self.centre) / self.radius_m
        position = self.centre + self.radius_m * (
            math.cos(turn) * outward + math.sin(turn) * self.tangent
        )
        return position, math.cos(turn) * self.tangent - math.sin(turn) * outward


@dataclass(frozen=True)
class CentreLine:
    """The pieces of a span's centre line in order of station."""

    pieces: tuple[Piece, ...]

    @classmethod
    def through(cls, legs: tuple[Leg, ...]) -> CentreLine:
        """Straight pieces joined by arcs, starting at the origin."""
        directions = [np.asarray(leg.direction, dtype=float) for leg in legs]
        cuts = [0.0] + [_tangent_length(a, b) for a, b in pairwise(legs)] + [0.0]
        pieces: list[Piece] = []
        corner = np.zeros(3)
        station = 0.0
        for i, (leg, direction) in enumerate(zip(legs, directions, strict=True)):
            before, after = cuts[i], cuts[i + 1]
            straight_start, straight_end = station + before, station + leg.length_m - after
            if straight_end - straight_start > END_TOLERANCE_M:
                pieces.append(
                    Piece(straight_start, straight_end, corner + before * direction, direction)
                )
            station += leg.length_m
            corner = corner + leg.length_m * direction
            if i + 1 < len(legs) and after > 0.0:
                pieces.append(_arc(corner, station, direction, directions[i + 1], after))
        return cls(tuple(pieces))

    def piece_at(self, station_m: float) -> Piece:
        """The piece that holds a station; the ends belong to the first and the last."""
        for piece in self.pieces:
            if station_m <= piece.end_m + END_TOLERANCE_M:
                return piece
        return self.pieces[-1]

    def at(self, station_m: float) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Position (3,) in metres and unit tangent (3,) at a station."""
        return self.piece_at(station_m).at(station_m)


def axis_vectors(tangent: NDArray[np.float64], axis: str) -> NDArray[np.float64]:
    """Unit vectors (k, 3) that a named axis means where the pipe runs along ``tangent``.

    One row, except ``lateral`` on a vertical pipe (both horizontals) and ``rotation`` (the two
    axes across the pipe, to be read as rotation vectors). ``torsion`` is the axis of the pipe,
    to be read as a rotation vector.
    """
    if axis == "torsion":
        return tangent[None]
    unit = {"x": (1.0, 0.0, 0.0), "y": (0.0, 1.0, 0.0), "z": (0.0, 0.0, 1.0)}
    if axis in unit:
        return np.array([unit[axis]])
    up = np.array(unit["z"])
    if is_vertical(tangent):
        horizontals = np.array([unit["x"], unit["y"]])
        across = {"vertical": up[None], "axial": up[None], "lateral": horizontals}
        return across.get(axis, horizontals)
    tx, ty, tz = (float(part) for part in tangent)
    level = math.hypot(tx, ty)
    lateral = np.array([-ty, tx, 0.0]) / level
    vertical = np.array([-tx * tz, -ty * tz, level**2]) / level
    named = {"vertical": vertical[None], "lateral": lateral[None], "axial": tangent[None]}
    vectors: NDArray[np.float64] = named.get(axis, np.array([lateral, vertical]))
    return vectors


def is_vertical(tangent: NDArray[np.float64]) -> bool:
    """Whether a pipe along ``tangent`` is a riser (within 8 degrees of plumb)."""
    return bool(abs(tangent[2]) > 0.99)


def bend_angle_rad(first: Leg, second: Leg) -> float:
    """Angle the pipe turns through between two legs, 0 to pi."""
    cosine = float(np.dot(first.direction, second.direction))
    return math.acos(min(1.0, max(-1.0, cosine)))


def _tangent_length(first: Leg, second: Leg) -> float:
    return (second.bend_radius_m or 0.0) * math.tan(bend_angle_rad(first, second) / 2)


def _arc(
    corner: NDArray[np.float64],
    corner_station_m: float,
    incoming: NDArray[np.float64],
    outgoing: NDArray[np.float64],
    tangent_length_m: float,
) -> Piece:
    angle = math.acos(min(1.0, max(-1.0, float(incoming @ outgoing))))
    radius = tangent_length_m / math.tan(angle / 2)
    start = corner - tangent_length_m * incoming
    inward = outgoing - (outgoing @ incoming) * incoming
    inward = inward / np.linalg.norm(inward)
    return Piece(
        corner_station_m - tangent_length_m,
        corner_station_m + tangent_length_m,
        start,
        incoming,
        centre=start + radius * inward,
        angle_rad=angle,
        radius_m=radius,
    )


def _check(span: Span) -> None:
    if not span.legs:
        raise _bad("the span has no leg", "add a [[leg]] with direction and length", "leg")
    for i, leg in enumerate(span.legs):
        _check_leg(leg, span.pipe, i)
    _check_bends_fit(span.legs)
    for i, support in enumerate(span.supports):
        _check_station("support", i, support.at_m, span.length_m)
        _check_stiffness(support, i)
    for i, mass in enumerate(span.masses):
        _check_station("mass", i, mass.at_m, span.length_m)
        if not mass.mass_kg >= 0 or not math.isfinite(mass.mass_kg):
            what = f"a mass of {mass.mass_kg:g} kg"
            raise _bad(what, "give a mass of zero or more", f"mass[{i}].mass")


def _bad(what: str, remedy: str, where: str) -> InputError:
    return InputError(what, remedy, Place(field=where))


def _check_leg(leg: Leg, pipe: PipeSection, i: int) -> None:
    if not leg.length_m > 0 or not math.isfinite(leg.length_m):
        what = f"a leg of {leg.length_m:g} m"
        raise _bad(what, "give a length above zero", f"leg[{i}].length")
    if not math.isclose(math.hypot(*leg.direction), 1.0, rel_tol=1e-6):
        what = f"the direction {leg.direction} is no unit vector"
        raise _bad(what, "divide it by its length", f"leg[{i}].direction")
    radius = leg.bend_radius_m
    if radius is not None and not pipe.outside_diameter_m / 2 < radius < math.inf:
        raise _bad(
            f"a bend radius of {radius * 1e3:g} mm does not fit a pipe of "
            f"{pipe.outside_diameter_m * 1e3:g} mm",
            "give the radius to the centre line, above half the outside diameter",
            f"leg[{i}].bend_radius",
        )


def _check_bends_fit(legs: tuple[Leg, ...]) -> None:
    cuts = [_corner_cut(legs, i) for i in range(1, len(legs))]
    for i, leg in enumerate(legs):
        used = sum(cuts[max(0, i - 1) : i + 1])
        if used > leg.length_m + END_TOLERANCE_M:
            raise _bad(
                f"the bends take {used:.3f} m of a leg only {leg.length_m:.3f} m long",
                "give a smaller bend_radius, or the leg's length from corner to corner",
                f"leg[{i}].length",
            )


def _check_station(name: str, i: int, at_m: float, end_m: float) -> None:
    if not -END_TOLERANCE_M <= at_m <= end_m + END_TOLERANCE_M:
        raise _bad(
            f"{name} at {at_m:g} m lies outside the span, which runs from 0 to {end_m:g} m",
            "correct the station, or the length of the legs",
            f"{name}[{i}].at",
        )


def _check_stiffness(support: Support, i: int) -> None:
    for axis in (*AXES, "torsion"):
        value = getattr(support, axis)
        if isinstance(value, Believed):
            value = value.median
        if not isinstance(value, str) and not value >= 0:
            what = f"a stiffness of {value:g}"
            raise _bad(what, "give zero (free) or more", f"support[{i}].{axis}")


def _corner_cut(legs: tuple[Leg, ...], i: int) -> float:
    """Length of leg that the bend before leg ``i`` takes; refuses a leg that doubles back."""
    angle = bend_angle_rad(legs[i - 1], legs[i])
    if angle > math.radians(175):
        raise InputError(
            "this leg runs straight back along the one before",
            "give its direction as seen when walking along the pipe",
            Place(field=f"leg[{i}].direction"),
        )
    return _tangent_length(legs[i - 1], legs[i])
