"""Where a pipe runs: points along straight legs and elbows, and which way it points there.

A station is the distance along the legs from corner to corner, the way a tape is laid on site.
An elbow of radius R starts R tan(a/2) before its corner and ends as far behind it; between those
two tangent points stations advance evenly along the arc.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Leg:
    """A straight run from corner to corner, with the radius of the elbow at its start."""

    direction: tuple[float, float, float]
    length_m: float
    bend_radius_m: float = 0.0


@dataclass(frozen=True)
class Stretch:
    """A piece of centre line between two stations."""

    start_m: float
    end_m: float
    points: tuple[Array, ...]
    """Straight: first point, direction. Elbow: centre, outward radius, direction at its start."""
    angle_rad: float = 0.0

    @property
    def is_elbow(self) -> bool:
        """Whether it is curved."""
        return self.angle_rad > 0.0

    def locate(self, station_m: float) -> tuple[Array, Array]:
        """Point and unit direction at a station."""
        if not self.is_elbow:
            start, along = self.points
            return start + (station_m - self.start_m) * along, along
        centre, outward, along = self.points
        turned = self.angle_rad * (station_m - self.start_m) / (self.end_m - self.start_m)
        radius = np.linalg.norm(outward)
        point = centre + math.cos(turned) * outward + math.sin(turned) * radius * along
        direction = math.cos(turned) * along - math.sin(turned) * outward / radius
        return point, direction


def stretches(legs: tuple[Leg, ...]) -> list[Stretch]:
    """Straight pieces and elbows in order, from the origin."""
    found: list[Stretch] = []
    corner, station, behind = np.zeros(3), 0.0, 0.0
    for leg, following in zip(legs, (*legs[1:], None), strict=True):
        along = np.asarray(leg.direction, dtype=float)
        ahead = _tangent_length(leg, following) if following else 0.0
        first = corner + behind * along
        found.append(Stretch(station + behind, station + leg.length_m - ahead, (first, along)))
        station += leg.length_m
        corner = corner + leg.length_m * along
        if following and ahead > 0.0:
            found.append(_elbow(corner, station, along, following, ahead))
        behind = ahead
    return [stretch for stretch in found if stretch.end_m > stretch.start_m]


def mesh_stations(line: list[Stretch], marked: list[float], step_m: float, chords: int) -> Array:
    """Stations of nodes: every marked one, tangent points, and evenly at most ``step_m`` apart.

    An elbow gets ``chords`` chords, whatever its size.
    """
    stations = [line[0].start_m]
    for stretch in line:
        inside = [s for s in sorted(set(marked)) if stretch.start_m < s < stretch.end_m]
        stops = [stretch.start_m, *inside, stretch.end_m]
        longest = (stretch.end_m - stretch.start_m) / chords if stretch.is_elbow else step_m
        for a, b in pairwise(stops):
            pieces = max(1, math.ceil((b - a) / longest - 1e-9))
            stations += list(np.linspace(a, b, pieces + 1)[1:])
    return np.array(stations)


def stretch_at(line: list[Stretch], station_m: float) -> Stretch:
    """The piece that holds a station."""
    return next((piece for piece in line if station_m <= piece.end_m + 1e-9), line[-1])


def axis_vectors(direction: Array, axis: str) -> Array:
    """(k, 3) unit vectors of a named axis where the pipe runs along ``direction``.

    ``lateral`` on a riser means both horizontals; ``rotation`` means turning about the two axes
    across the pipe and ``twist`` about the pipe itself.
    """
    up = np.array([0.0, 0.0, 1.0])
    horizontals = np.eye(3)[:2]
    if axis in ("x", "y", "z"):
        return np.eye(3)[["xyz".index(axis)]]
    if axis in ("axial", "twist"):
        return direction[None]
    if abs(direction[2]) > 0.99:
        return up[None] if axis == "vertical" else horizontals
    lateral = np.cross(up, direction) / np.linalg.norm(np.cross(up, direction))
    vertical = np.cross(direction, lateral)
    across: dict[str, Array] = {"vertical": vertical[None], "lateral": lateral[None]}
    return across.get(axis, np.array([lateral, vertical]))


def _tangent_length(leg: Leg, following: Leg) -> float:
    cosine = float(np.dot(leg.direction, following.direction))
    return following.bend_radius_m * math.tan(math.acos(cosine) / 2)


def _elbow(corner: Array, station: float, along: Array, following: Leg, cut: float) -> Stretch:
    onward = np.asarray(following.direction, dtype=float)
    angle = math.acos(float(along @ onward))
    inward = onward - (onward @ along) * along
    outward = -following.bend_radius_m * inward / np.linalg.norm(inward)
    centre = corner - cut * along - outward
    return Stretch(station - cut, station + cut, (centre, outward, along), angle)
