"""The cross-section of a pipe, measured or from the standard sizes."""

from __future__ import annotations

import math
from dataclasses import dataclass

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
