"""Where the sensors sit and which way they look: one place for each channel that is judged."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass


@dataclass(frozen=True)
class Place:
    """Where a sensor sits, and which way it looks."""

    direction: str | None = None
    at_m: float | None = None

    def __str__(self) -> str:
        way = self.direction or "unknown direction"
        return way if self.at_m is None else f"{way} at {self.at_m:.2f} m"


@dataclass(frozen=True)
class Ear:
    """A channel that hears the response."""

    channel: int
    """From 0."""
    place: Place
    scale: float = 1.0
    """What a sample of 1 stands for, in a unit that all ears of a test share."""

    def __str__(self) -> str:
        way = f" ({self.place.direction})" if self.place.direction else ""
        return f"channel {self.channel + 1}{way}"


def together(places: Sequence[Place]) -> str:
    """All of them in a few words; the station once where they share it."""
    stations = {place.at_m for place in places}
    if len(stations) > 1:
        return ", ".join(map(str, places))
    ways = ", ".join(place.direction or "unknown direction" for place in places)
    return str(Place(ways, stations.pop())) if places else ""
