"""What the channels of an input are connected to, in the words of a job's recordings."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass, fields

from fieldkit.errors import InputError, Place
from fieldkit.quantity import chosen, parse, scale_of
from fieldkit.signal.recording import DIRECTIONS, QUANTITIES

FORCE = "force"
"""What the channel of an instrumented hammer measures."""
CAPTURED = (*QUANTITIES, FORCE)


@dataclass(frozen=True)
class ChannelSetup:
    """One channel; quantities stay the text a person typed, and are checked when it is made.

    Raises InputError whose place is the key at fault.
    """

    quantity: str = "acceleration"
    """One of CAPTURED."""
    sensitivity: str | None = None
    """Of the sensor, such as ``100 mV/g``."""
    full_scale: str | None = None
    """Voltage at which the input reads 1, such as ``1.4 V``."""
    scale: str | None = None
    """Instead of both: what a sample of 1 stands for, such as ``9.81 m/s^2``."""
    direction: str | None = None
    """One of DIRECTIONS; None: unknown."""
    at: str | None = None
    """Station along the span, such as ``1.9 m``."""

    def __post_init__(self) -> None:
        with _naming("quantity"):
            chosen(self.quantity, "measured quantity", CAPTURED)
        if self.direction is not None:
            with _naming("direction"):
                chosen(self.direction, "direction", DIRECTIONS)
        _ = self.si_per_unit, self.at_m

    @property
    def si_per_unit(self) -> float | None:
        """SI units of the quantity per unit of sample; None where uncalibrated."""
        return scale_of(
            self.quantity,
            sensitivity=self.sensitivity,
            full_scale=self.full_scale,
            scale=self.scale,
        )

    @property
    def at_m(self) -> float | None:
        """Station in metres."""
        if self.at is None:
            return None
        with _naming("at"):
            return parse(self.at, "length")

    def as_table(self) -> dict[str, str]:
        """The keys of a ``[[recording]]`` that it fills."""
        values = {field.name: getattr(self, field.name) for field in fields(self)}
        return {key: value for key, value in values.items() if value is not None}


def setup_from(table: Mapping[str, object]) -> ChannelSetup:
    """From a table of a file; unknown keys and values that are no text raise InputError."""
    known = {field.name for field in fields(ChannelSetup)}
    for key, value in table.items():
        if key not in known or not isinstance(value, str):
            what = "this is not known here" if key not in known else f"{value!r} is not text"
            raise InputError(what, f"use {', '.join(sorted(known))}", Place(field=str(key)))
    return ChannelSetup(**{key: str(value) for key, value in table.items()})


@contextmanager
def _naming(key: str) -> Iterator[None]:
    """Gives an InputError the key it is about."""
    try:
        yield
    except InputError as error:
        raise error.at(field=key) from None
