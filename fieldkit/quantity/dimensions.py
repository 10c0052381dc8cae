"""The kinds of quantity a job speaks of: their SI unit, their limits, how people write them."""

from __future__ import annotations

import math
from dataclasses import dataclass

ATMOSPHERE_PA = 101325.0


@dataclass(frozen=True)
class Dimension:
    """One kind of quantity."""

    noun: str
    """With its article, as error messages name it."""
    si: tuple[str, ...]
    """SI unit as this package spells it; several where the unit decides what is meant."""
    examples: str
    """How a person writes one, for error messages."""
    low: float = -math.inf
    """Least value that can exist, in SI."""
    low_allowed: bool = True
    """Whether ``low`` itself can exist."""
    below: str = ""
    """What is wrong with a value below ``low``."""
    high: float = math.inf
    """Largest value anything near a pipe has."""
    bare_from: float | None = 0.0
    """Least magnitude at which a number without a unit is believed to be SI; None: never.
    Zero is the same in every unit and always believed, where the unit has no offset."""
    bare_units: tuple[str, ...] = ()
    """Units to offer for a bare number that is not believed, most likely first."""


def _positive(noun: str, si: str, examples: str, high: float, **more: object) -> Dimension:
    """A quantity of zero or more."""
    limits = {"low": 0.0, "below": f"{noun} cannot be negative", "high": high}
    return Dimension(noun, (si,), examples, **(limits | more))  # type: ignore[arg-type]


def _sensitivity(noun: str, examples: str, si: tuple[str, ...], *bare_units: str) -> Dimension:
    below = "a sensitivity must be above zero"
    return Dimension(
        noun, si, examples,
        low=0.0, low_allowed=False, below=below, bare_from=None, bare_units=bare_units,
    )  # fmt: skip


DIMENSIONS: dict[str, Dimension] = {
    "length": _positive("a length", "m", "'4.2 m', '88.9 mm' or '13 ft 9 in'", 1e5),
    "offset": Dimension("a length", ("m",), "'0.18 m', '-50 mm' or '7 in'", low=-1e5, high=1e5),
    "mass": _positive("a mass", "kg", "'24 kg' or '50 lb'", 1e6),
    "frequency": _positive("a frequency", "Hz", "'100 Hz' or '1480 rpm'", 1e6),
    "speed": _positive(
        "a shaft speed", "Hz", "'1480 rpm' or '25 Hz'", 1e4,
        bare_from=None, bare_units=("rpm", "Hz"),
    ),
    "force": _positive("a force", "N", "'2 kN' or '450 lbf'", 1e9),
    "stiffness": _positive(
        "a stiffness", "N/m", "'2 MN/m', '2e6 N/m' or '11 kip/in'", 1e15,
        bare_from=1e3, bare_units=("MN/m", "N/m"),
    ),
    "rotational_stiffness": _positive(
        "a rotational stiffness", "N*m/rad", "'250 kN m/rad' or '2200 kip in/rad'", 1e15,
        bare_from=1e2, bare_units=("kN m/rad", "N m/rad"),
    ),
    "temperature": Dimension(
        "a temperature", ("K",), "'65 degC' or '149 degF'",
        low=0.0, low_allowed=False, below="that is below absolute zero", high=3000.0,
        bare_from=250.0, bare_units=("degC", "K"),
    ),
    "pressure": Dimension(
        "a gauge pressure", ("Pa",), "'6 bar', '600 kPa' or '87 psi'",
        low=-ATMOSPHERE_PA, below="that is below a full vacuum", high=1e9,
        bare_from=1e3, bare_units=("bar", "Pa"),
    ),
    "modulus": Dimension(
        "an elastic modulus", ("Pa",), "'200 GPa' or '29000 ksi'",
        low=1e5, below="that is too small for a pipe", high=2e12, bare_units=("GPa", "MPa"),
    ),
    "density": _positive("a density", "kg/m^3", "'998 kg/m^3' or '62.4 lb/ft^3'", 3e4),
    "acceleration": Dimension("an acceleration", ("m/s^2",), "'9.81 m/s^2' or '1 g'"),
    "velocity": Dimension("a velocity", ("m/s",), "'18 mm/s' or '0.7 in/s'"),
    "sound_pressure": Dimension("a sound pressure", ("Pa",), "'20 Pa' or '2 mbar'"),
    "voltage": Dimension("a voltage", ("V",), "'1.4 V' or '200 mV'"),
    "acceleration_sensitivity": _sensitivity(
        "a sensitivity to acceleration", "'100 mV/g' or '10.2 mV/(m/s^2)'",
        ("V/(m/s^2)",), "mV/g", "mV/(m/s^2)",
    ),
    "velocity_sensitivity": _sensitivity(
        "a sensitivity to velocity", "'4 V/(in/s)' or '20 mV/(mm/s)'",
        ("V/(m/s)",), "mV/(mm/s)", "mV/(in/s)",
    ),
    "displacement_sensitivity": _sensitivity(
        "a sensitivity to displacement", "'8 mV/um' or '200 mV/mil'",
        ("V/m",), "mV/um", "mV/mil",
    ),
    "pressure_sensitivity": _sensitivity(
        "a sensitivity to sound pressure", "'50 mV/Pa'", ("V/Pa",), "mV/Pa",
    ),
    "force_sensitivity": _sensitivity(
        "a sensitivity to force", "'2.3 mV/N' or '10 mV/lbf'", ("V/N",), "mV/N", "mV/lbf",
    ),
    "sensitivity": _sensitivity(
        "a sensitivity", "'100 mV/g', '4 V/(in/s)' or '50 mV/Pa'",
        ("V/(m/s^2)", "V/(m/s)", "V/m", "V/Pa"), "mV/g", "mV/Pa",
    ),
    "expansion": Dimension(
        "a thermal expansion coefficient", ("1/K",), "'12e-6 1/K' or '6.5e-6 in/in/degF'",
        low=-1e-4, below="that is too large for a pipe", high=1e-3,
    ),
    "ratio": Dimension("a ratio", ("1",), "'0.15' or '15 %'"),
}  # fmt: skip
