"""The cross-section of a pipe, measured or from the standard sizes.

Standard sizes are those of ASME B36.10M and B36.19M, in millimetres, as tabled by the ``fluids``
library. They are found by size and schedule only, never by diameter.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from fractions import Fraction
from typing import cast

from fieldkit.errors import InputError, Place


@dataclass(frozen=True)
class PipeSection:
    """A round pipe wall."""

    outside_diameter_m: float
    wall_m: float
    label: str = ""
    """How a person names it, such as ``NPS 3 schedule 40``."""

    def __post_init__(self) -> None:
        if not 0 < self.wall_m < self.outside_diameter_m / 2:
            raise InputError(
                f"a wall of {self.wall_m * 1e3:g} mm does not fit an outside diameter of "
                f"{self.outside_diameter_m * 1e3:g} mm",
                "the wall must be above zero and below half the diameter",
                Place(field="pipe.wall"),
            )

    @property
    def bore_m(self) -> float:
        """Inside diameter."""
        return self.outside_diameter_m - 2 * self.wall_m

    @property
    def wall_area_m2(self) -> float:
        """Area of the metal."""
        return math.pi / 4 * (self.outside_diameter_m**2 - self.bore_m**2)

    @property
    def bore_area_m2(self) -> float:
        """Area of the contents when full."""
        return math.pi / 4 * self.bore_m**2

    @property
    def second_moment_m4(self) -> float:
        """Second moment of area about a diameter."""
        return math.pi / 64 * (self.outside_diameter_m**4 - self.bore_m**4)

    @property
    def mean_radius_m(self) -> float:
        """Radius to the middle of the wall."""
        return (self.outside_diameter_m - self.wall_m) / 2


SCHEDULES = (
    "5", "10", "20", "30", "40", "60", "80", "100", "120", "140", "160",
    "STD", "XS", "XXS", "5S", "10S", "40S", "80S",
)  # fmt: skip
"""Steel schedules; not every size exists in every one."""

_DN_OF_NPS = {
    "1/8": 6, "1/4": 8, "3/8": 10, "1/2": 15, "3/4": 20, "1": 25, "1-1/4": 32, "1-1/2": 40,
    "2": 50, "2-1/2": 65, "3": 80, "3-1/2": 90, "4": 100, "5": 125, "6": 150,
} | {str(nps): 25 * nps for nps in range(8, 50, 2)}  # fmt: skip
"""Nominal diameter in millimetres by nominal pipe size in inches (ASME B36.10M)."""


def standard_pipe(size: str, schedule: str) -> PipeSection:
    """The section of a standard pipe, such as ``NPS 3`` or ``DN 80`` and ``40`` or ``STD``.

    InputError names the sizes, or the schedules of that size, where there is no such pipe.
    """
    nps = _nominal_size(size)
    spoken = _schedule(schedule)
    found = _looked_up(nps, spoken) if spoken in SCHEDULES else None
    if found is None:
        raise InputError(
            f"NPS {nps} does not exist in schedule {schedule!r}",
            f"it exists in {', '.join(known_schedules(nps))}; or give outside_diameter and wall",
            Place(field="pipe.schedule"),
        )
    outside_diameter_m, wall_m = found
    return PipeSection(outside_diameter_m, wall_m, f"NPS {nps} schedule {spoken}")


def known_sizes() -> tuple[str, ...]:
    """Nominal pipe sizes in inches, as people write them, for which there is a schedule."""
    return tuple(nps for nps in _DN_OF_NPS if known_schedules(nps))


def known_schedules(size: str) -> tuple[str, ...]:
    """Schedules in which a nominal size exists."""
    nps = _nominal_size(size)
    return tuple(schedule for schedule in SCHEDULES if _looked_up(nps, schedule) is not None)


def is_schedule(schedule: str) -> bool:
    """Whether any pipe exists in a schedule of this name."""
    return _schedule(schedule) in SCHEDULES


def nominal_diameter_mm(size: str) -> int:
    """The DN of a nominal size."""
    return _DN_OF_NPS[_nominal_size(size)]


def _nominal_size(size: str) -> str:
    """Nominal pipe size as tabled, from however a person writes it."""
    spoken = str(size).strip().upper().replace("INCHES", "").replace("INCH", "").rstrip('"')
    spoken = spoken.removesuffix("IN.").removesuffix("IN").strip()
    metric = re.fullmatch(r"DN\s*(\d+)", spoken)
    if metric:
        for nps, dn in _DN_OF_NPS.items():
            if dn == int(metric[1]):
                return nps
    else:
        inches = _inches(spoken.removeprefix("NPS").strip())
        for nps in _DN_OF_NPS:
            if inches is not None and inches == _inches(nps):
                return nps
    raise InputError(
        f"there is no standard pipe size {size!r}",
        f"use NPS {', '.join(_DN_OF_NPS)} or the DN of one; or give outside_diameter and wall",
        Place(field="pipe.size"),
    )


def _inches(spoken: str) -> Fraction | None:
    """``2``, ``2.5``, ``1/2``, ``2-1/2`` or ``2 1/2`` as a number."""
    parts = re.fullmatch(r"(?:(\d+)[-\s]+)?(\d+/[1-9]\d*|\d+(?:\.\d+)?|\.\d+)", spoken)
    if parts is None or (parts[1] is not None and "/" not in parts[2]):
        return None
    return Fraction(parts[1] or 0) + Fraction(parts[2])


def _schedule(schedule: str) -> str:
    spoken = re.sub(r"[\s.]", "", str(schedule).upper())
    return spoken.removeprefix("SCHEDULE").removeprefix("SCH")


def _looked_up(nps: str, schedule: str) -> tuple[float, float] | None:
    """(outside_diameter_m, wall_m), or None where the size does not exist in the schedule."""
    from fluids.piping import nearest_pipe

    inches = _inches(nps)
    if inches is None:
        return None
    try:
        found = nearest_pipe(NPS=cast(int, float(inches)), schedule=schedule)
    except ValueError:
        return None
    _nps, _bore, outside_diameter, wall = (round(value, 7) for value in found)
    return outside_diameter, wall
