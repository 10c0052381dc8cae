"""Look at a span from a side: planes of projection, the best one, and the fit onto dots."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.span.layout import Span

Floats = NDArray[np.float64]
POINTS_PER_ARC = 9
POINTS_PER_STRAIGHT = 9
SLANTED_WORTH = 0.8
"""An isometric view must show this much more than a flat one to be preferred."""


@dataclass(frozen=True)
class Plane:
    """Which way space lies on the screen."""

    name: str
    across: tuple[float, float, float]
    """Screen right of each unit vector x, y, z."""
    up: tuple[float, float, float]
    """Screen up of each unit vector."""
    key: str
    """Its axes in a few cells."""

    def project(self, points: Floats) -> Floats:
        """(n, 3) positions or displacements to (n, 2): right and up."""
        flat: Floats = points @ np.array([self.across, self.up]).T
        return flat


COS_30 = 3**0.5 / 2
PLANES = (
    Plane("elevation x-z", (1, 0, 0), (0, 0, 1), "z↑ x→"),
    Plane("elevation y-z", (0, 1, 0), (0, 0, 1), "z↑ y→"),
    Plane("plan x-y", (1, 0, 0), (0, 1, 0), "y↑ x→"),
    Plane("isometric", (COS_30, -COS_30, 0), (0.5, 0.5, 1), "z↑ x↗ y↖"),
)

ARROWS = "→↗↑↖←↙↓↘"
UNSEEN = 0.15
"""An axis that shows less than this share of its length has no direction on the screen."""
FREE_START = (-45, 35)
"""Turn and tilt that a free view starts from, degrees: nearly the isometric one."""


def turned(turn_deg: float, tilt_deg: float) -> Plane:
    """The view from a turn about z (0 is elevation x-z, 90 y-z) and a tilt (90 is plan)."""
    turn, tilt = math.radians(turn_deg), math.radians(tilt_deg)
    across = (math.cos(turn), math.sin(turn), 0.0)
    up = (-math.sin(turn) * math.sin(tilt), math.cos(turn) * math.sin(tilt), math.cos(tilt))
    key = " ".join(
        f"{name}{_arrow(right, above)}"
        for name, right, above in zip(
            "zxy", (across[2], *across[:2]), (up[2], *up[:2]), strict=True
        )
    )
    return Plane(f"turned {turn_deg:.0f}°, from {tilt_deg:.0f}° up", across, up, key)


def _arrow(right: float, above: float) -> str:
    """The way a unit vector points on the screen; a dot where it points at the reader."""
    if math.hypot(right, above) < UNSEEN:
        return "·"
    return ARROWS[round(math.atan2(above, right) / (math.pi / 4)) % 8]


def centre_line_points(span: Span) -> tuple[Floats, Floats]:
    """Stations (n,) and positions (n, 3) close enough together to draw every bend round."""
    pieces = span.centre_line.pieces
    stations = np.concatenate(
        [
            np.linspace(
                piece.start_m,
                piece.end_m,
                POINTS_PER_STRAIGHT if piece.centre is None else POINTS_PER_ARC,
            )
            for piece in pieces
        ]
    )
    return stations, positions(span, stations)


def positions(span: Span, stations: Sequence[float] | Floats) -> Floats:
    """Where stations lie in space, (n, 3)."""
    line = span.centre_line
    return np.array([line.at(float(station))[0] for station in stations]).reshape(-1, 3)


def best_plane(points: Floats, shape: Floats | None = None) -> Plane:
    """The plane that hides least of the pipe, and of the motion across it, (n, 3) each.

    The worth of a plane is the smallest share of any axis-wise run that it shows, times the share
    of the motion seen across the drawn line.
    """
    worths = [
        _pipe_seen(plane, points)
        * (_motion_seen(plane, points, shape) if shape is not None else 1.0)
        * (SLANTED_WORTH if plane.name == "isometric" else 1.0)
        for plane in PLANES
    ]
    best = max(worths)
    return next(p for p, worth in zip(PLANES, worths, strict=True) if worth >= best - 1e-9)


def _pipe_seen(plane: Plane, points: Floats) -> float:
    steps = np.diff(points, axis=0)
    runs = np.abs(steps).sum(axis=0)
    unit_seen = np.linalg.norm(plane.project(np.eye(3)), axis=1)
    present = runs > 0.02 * runs.sum()
    return float(min(1.0, unit_seen[present].min(initial=1.0)))


def _motion_seen(plane: Plane, points: Floats, shape: Floats) -> float:
    along = np.gradient(plane.project(points), axis=0)
    length = np.linalg.norm(along, axis=1, keepdims=True)
    along = np.divide(along, length, out=np.zeros_like(along), where=length > 0)
    seen = plane.project(shape)
    across = seen - along * np.sum(seen * along, axis=1, keepdims=True)
    total = float(np.linalg.norm(shape))
    return float(np.linalg.norm(across)) / total if total > 0 else 1.0


@dataclass(frozen=True)
class Fit:
    """Plane coordinates to dots, the same scale both ways."""

    dots_per_m: float
    centre: Floats
    """(2,) plane coordinates in the middle of the drawing."""
    middle: Floats
    """(2,) the dots they fall on."""

    def dots(self, flat: Floats) -> Floats:
        """(n, 2) right and up in metres to (n, 2) dots right and down."""
        offset = (flat - self.centre) * self.dots_per_m
        return np.asarray(self.middle + offset * np.array([1.0, -1.0]))


def fit(flat: Floats, left: float, right: float, top: float, bottom: float) -> Fit:
    """The largest scale at which points (n, 2) lie between these dots."""
    low, high = flat.min(axis=0), flat.max(axis=0)
    size = np.maximum(high - low, 1e-9)
    room = np.maximum([right - left, bottom - top], 1.0)
    scale = float(np.min(room / size))
    middle = np.array([left + right, top + bottom]) / 2
    return Fit(scale, (low + high) / 2, middle)
