"""Curves and lines as dots: reduced to extremes per column, cut at the edges, stepped along."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


def envelope(x: Floats, y: Floats, edges: Floats) -> tuple[Floats, Floats]:
    """Lowest and highest value of a curve between neighbouring ``edges``.

    The curve joins the points (``x`` rising, ``y``) by straight lines, so the result is exact
    whether a column holds a thousand points or none. NaN in ``y`` breaks the curve; columns
    without any part of it are NaN.

    Returns:
        ``low``, ``high``: (len(edges) - 1,) each.
    """
    columns = len(edges) - 1
    low = np.full(max(columns, 0), np.nan)
    high = low.copy()
    if columns < 1 or len(x) == 0:
        return low, high
    at_edges = np.interp(edges, x, y, left=np.nan, right=np.nan)
    low = np.fmin(at_edges[:-1], at_edges[1:])
    high = np.fmax(at_edges[:-1], at_edges[1:])
    first = np.searchsorted(x, edges)
    held = np.flatnonzero(np.diff(first) > 0)
    if len(held):
        inside = y[: first[-1]]
        low[held] = np.fmin(low[held], np.fmin.reduceat(inside, first[held]))
        high[held] = np.fmax(high[held], np.fmax.reduceat(inside, first[held]))
    return low, high


def clipped_segments(points: Floats, width: int, height: int) -> tuple[Floats, Floats]:
    """Segments of a polyline (n, 2) cut to the rectangle of dots (Liang and Barsky 1984).

    Returns:
        ``starts``, ``ends``: (k, 2) each; segments outside or with NaN are left out.
    """
    starts, ends = points[:-1], points[1:]
    whole = np.isfinite(starts).all(axis=1) & np.isfinite(ends).all(axis=1)
    starts, ends = starts[whole], ends[whole]
    along = ends - starts
    low, high = np.full(2, -0.499), np.array([width, height]) - 0.501
    with np.errstate(divide="ignore", invalid="ignore"):
        at_low, at_high = (low - starts) / along, (high - starts) / along
    still = along == 0
    inside = (starts >= low) & (starts <= high)
    enter = np.where(still, np.where(inside, 0.0, 2.0), np.minimum(at_low, at_high))
    leave = np.where(still, np.where(inside, 1.0, -1.0), np.maximum(at_low, at_high))
    first = np.maximum(0.0, enter.max(axis=1, initial=0.0))
    last = np.minimum(1.0, leave.min(axis=1, initial=1.0))
    seen = first <= last
    first, last = first[seen, None], last[seen, None]
    return starts[seen] + first * along[seen], starts[seen] + last * along[seen]


def steps_along(starts: Floats, ends: Floats) -> Floats:
    """Points (n, 2) along every segment, one per dot of its longer side."""
    along = ends - starts
    steps = np.ceil(np.abs(along).max(axis=1, initial=0.0)).astype(int) + 1
    owner = np.repeat(np.arange(len(starts)), steps)
    first = np.repeat(np.cumsum(steps) - steps, steps)
    share = (np.arange(len(owner)) - first) / np.maximum(1, steps[owner] - 1)
    return np.asarray(starts[owner] + share[:, None] * along[owner])


def every_other(dots: NDArray[np.int_], group: int) -> NDArray[np.int_]:
    """Every other group of different dots along a line."""
    fresh = np.ones(len(dots), dtype=bool)
    fresh[1:] = (np.diff(dots, axis=0) != 0).any(axis=1)
    dots = dots[fresh]
    drawn = np.arange(len(dots)) // group % 2 == 0
    return np.asarray(dots[drawn])
