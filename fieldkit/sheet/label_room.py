"""Where the labels of a drawing go: beside what they name, over nothing else."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

LETTER_PT, LINE_PT = 4.6, 10.0
STEPS_PT = (0.0, 12.0, 24.0, 36.0, 48.0)
SHIFTS_PT = (0.0, 13.0, -13.0, 26.0, -26.0, 40.0, -40.0)
SIDEWAYS = 0.35
"""Share of a way to the side from which a label begins or ends there, not in its middle."""


@dataclass(frozen=True)
class Wish:
    """A label, the point it belongs to, and on which side it would like to stand."""

    text: str
    at: Array
    """(2,) points right and up."""
    across: Array
    """(2,) unit vector off the line, on the side of a positive distance."""
    off_pt: float


@dataclass(frozen=True)
class Place:
    """Where a label stands from its point, and which end of it that is."""

    offset: Array
    side: str
    """``left``, ``center`` or ``right``, as a drawing library aligns text."""


@dataclass(frozen=True)
class Box:
    """A rectangle in points."""

    left: float
    right: float
    low: float
    high: float

    def holds(self, other: Box) -> bool:
        """Whether another lies within this one."""
        across = self.left <= other.left and other.right <= self.right
        return across and self.low <= other.low and other.high <= self.high

    def meets(self, other: Box) -> bool:
        """Whether two share any room."""
        across = self.left < other.right and other.left < self.right
        return across and self.low < other.high and other.low < self.high


def places(wishes: Sequence[Wish], line: Array, half_thick_pt: float, page: Box) -> list[Place]:
    """One place for each label, in order; what finds no free room stands where it wished.

    ``line`` (n, 2) is the drawn line in points, ``page`` what labels must keep within.
    """
    taken = [_around(point, half_thick_pt + 1.0) for point in line]
    taken += [_around(wish.at, 5.0) for wish in wishes]
    found = []
    for wish in wishes:
        free = (
            (place, box)
            for place in _choices(wish)
            for box in [_box(wish, place)]
            if page.holds(box) and not any(box.meets(other) for other in taken)
        )
        place, box = next(free, (_at(wish, 0.0, 0.0, 1.0), _box(wish, _at(wish, 0.0, 0.0, 1.0))))
        taken.append(box)
        found.append(place)
    return found


def _choices(wish: Wish) -> Iterator[Place]:
    for step in STEPS_PT:
        for shift in SHIFTS_PT:
            for side in (1.0, -1.0):
                yield _at(wish, step, shift, side)


def _at(wish: Wish, step_pt: float, shift_pt: float, side: float) -> Place:
    along = np.array([wish.across[1], -wish.across[0]])
    reach = side * (wish.off_pt + np.copysign(step_pt, wish.off_pt))
    offset = reach * wish.across + shift_pt * along
    return Place(offset, _end(reach * float(wish.across[0]), abs(reach)))


def _end(right_pt: float, reach_pt: float) -> str:
    if abs(right_pt) < SIDEWAYS * reach_pt:
        return "center"
    return "left" if right_pt > 0 else "right"


def _box(wish: Wish, place: Place) -> Box:
    x, y = wish.at + place.offset
    width = LETTER_PT * len(wish.text)
    left = x - {"left": 0.0, "center": width / 2, "right": width}[place.side]
    return Box(left - 1, left + width + 1, y - LINE_PT / 2, y + LINE_PT / 2)


def _around(point: Array, half_pt: float) -> Box:
    x, y = point
    return Box(x - half_pt, x + half_pt, y - half_pt, y + half_pt)
