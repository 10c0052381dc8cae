"""Where the nodes of a span go: fine enough for every frequency asked for, and no finer.

In units of x = (beta h)^2, beta^4 = m omega^2 / EI, an element of length h raises a bending
frequency by x^2/1440 of itself (cubic shape functions, slender) and by s x/24 from its constant
shear, s = beta^2 EI / (kappa G A); rods and shafts by (k h)^2/24. The mesh keeps the sum below
MESH_ERROR.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import Refusal
from fieldkit.span.layout import Piece, Span
from fieldkit.span.line import Line

Array = NDArray[np.float64]

MESH_ERROR = 5e-4
LEAST_PER_STRETCH = 4
LEAST_PER_BEND = 3
LARGEST_CHORD_RAD = math.radians(12.0)
"""Chords through the middle of their arc: at this angle they err less than MESH_ERROR."""
APART_M = 2e-4
"""Closer stations share a node; no tape tells them apart."""
MOST_NODES = 2000


@dataclass(frozen=True)
class Mesh:
    """Nodes (N) in order of station and the elements (E = N - 1) between them."""

    station_m: Array
    position_m: Array
    tangent: Array
    chord_m: Array
    direction: Array
    """(E, 3) unit vectors from node to node."""
    arc_length_m: Array
    """(E,) along the true centre line."""
    bend_radius_m: Array
    """(E,), infinite on the straight."""
    bulge_m: Array
    """(E, 3) mean distance of the true centre line from the chord: two thirds of the rise."""


def longest_element_m(line: Line, up_to_hz: float, flexibility: float = 1.0) -> float:
    """Element length that keeps every frequency below ``up_to_hz`` within MESH_ERROR."""
    omega = 2 * math.pi * up_to_hz
    mass, bending = line.full_mass_kg_per_m, line.bending_n_m2 / flexibility
    beta2 = omega * math.sqrt(mass / bending)
    shear = beta2 * bending / line.shear_n
    x = 720 * (math.sqrt((shear / 24) ** 2 + 4 * MESH_ERROR / 1440) - shear / 24)
    longitudinal = omega * math.sqrt(mass / line.axial_n)
    torsional = omega * math.sqrt(2 * line.rotary_inertia_kg_m / line.torsion_n_m2)
    return min(math.sqrt(x / beta2), math.sqrt(24 * MESH_ERROR) / max(longitudinal, torsional))


def lay_mesh(
    span: Span, line: Line, up_to_hz: float, extra_stations_m: tuple[float, ...], flexibility: Array
) -> Mesh:
    """Mesh with nodes at ends, bends, supports, masses and the extra stations.

    ``flexibility`` holds the factor of each piece of the centre line. Refusal above MOST_NODES.
    """
    stations = _stations(span, line, up_to_hz, extra_stations_m, flexibility)
    centre_line = span.centre_line
    located = [centre_line.at(s) for s in stations]
    position = np.array([place for place, _ in located])
    apart = np.diff(position, axis=0)
    chord = np.linalg.norm(apart, axis=1)
    middle = (stations[:-1] + stations[1:]) / 2
    radius = np.array([centre_line.piece_at(s).radius_m for s in middle])
    rise = np.array([centre_line.at(s)[0] for s in middle]) - (position[:-1] + position[1:]) / 2
    along = np.array([_travelled(centre_line.pieces, s) for s in stations])
    return Mesh(
        station_m=stations,
        position_m=position,
        tangent=np.array([direction for _, direction in located]),
        chord_m=chord,
        direction=apart / chord[:, None],
        arc_length_m=np.diff(along),
        bend_radius_m=radius,
        bulge_m=np.where(np.isfinite(radius)[:, None], 2 / 3 * rise, 0.0),
    )


def _travelled(pieces: tuple[Piece, ...], station_m: float) -> float:
    """Length along the true centre line from the start to a station."""
    length = 0.0
    for piece in pieces:
        share = (station_m - piece.start_m) / (piece.end_m - piece.start_m)
        length += min(max(share, 0.0), 1.0) * piece.arc_length_m
    return length


def _stations(
    span: Span, line: Line, up_to_hz: float, extra_m: tuple[float, ...], flexibility: Array
) -> Array:
    wanted = [s.at_m for s in span.supports] + [m.at_m for m in span.masses] + list(extra_m)
    found: list[float] = [0.0]
    for piece, factor in zip(span.centre_line.pieces, flexibility, strict=True):
        longest = longest_element_m(line, up_to_hz, float(factor))
        within = sorted(s for s in wanted if piece.start_m + APART_M < s < piece.end_m - APART_M)
        stops = [*_spaced([piece.start_m, *within]), piece.end_m]
        for a, b in pairwise(stops):
            count = _count(piece, a, b, longest, line.outside_diameter_m)
            if len(found) + count > MOST_NODES:
                raise _too_many(up_to_hz)
            found += list(np.linspace(a, b, count + 1)[1:])
    spaced = _spaced(found[:-1])
    if len(spaced) > 1 and span.length_m - spaced[-1] < APART_M:
        spaced.pop()
    return np.array([*spaced, span.length_m])


def _count(piece: Piece, a: float, b: float, longest: float, diameter: float) -> int:
    """Elements between two stops of one piece."""
    share = (b - a) / (piece.end_m - piece.start_m)
    by_length = math.ceil(share * piece.arc_length_m / longest)
    if piece.centre is not None:
        turn = max(piece.angle_rad / LARGEST_CHORD_RAD, LEAST_PER_BEND)
        return max(by_length, math.ceil(share * turn - 1e-9))
    stubby = max(int((b - a) / (diameter / 2)), 1)
    return max(by_length, min(LEAST_PER_STRETCH, stubby))


def _spaced(stations: list[float]) -> list[float]:
    """Without those that follow closer than APART_M: motion is read between nodes as well."""
    kept = stations[:1]
    for station in stations[1:]:
        if station - kept[-1] >= APART_M:
            kept.append(station)
    return kept


def _too_many(up_to_hz: float) -> Refusal:
    return Refusal(
        f"modes up to {up_to_hz:g} Hz need more than {MOST_NODES} nodes on this span",
        "lower the frequency limit (goal.up_to), or describe a shorter part of the line",
    )
