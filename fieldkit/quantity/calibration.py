"""What one unit of a recorded sample stands for, from what is written on sensor and input."""

from __future__ import annotations

from fieldkit.errors import InputError, Place
from fieldkit.quantity.reading import parse, quoted

SCALED = {
    "acceleration": "acceleration",
    "velocity": "velocity",
    "displacement": "length",
    "pressure": "sound_pressure",
    "force": "force",
}
"""Dimension of a sample of each measured quantity."""


def scale_of(
    quantity: str,
    *,
    sensitivity: object = None,
    full_scale: object = None,
    scale: object = None,
    in_volts: bool = False,
) -> float | None:
    """SI units of the quantity per unit of sample; None where it is not known.

    A sensitivity alone calibrates samples that are ``in_volts``; samples of full scale 1 need the
    voltage of the full scale as well. Raises InputError whose place is the key at fault.
    """
    if scale is not None and (sensitivity is not None or full_scale is not None):
        what = "it has both a scale and a sensitivity"
        raise _bad("scale", what, "keep the one that is written on the sensor")
    if scale is not None:
        return _above_zero(_without_per_unit(scale), SCALED[quantity], "scale")
    if sensitivity is None and full_scale is None:
        return None
    if sensitivity is None:
        what = "it has full_scale without sensitivity"
        example = "2.3 mV/N" if quantity == "force" else "100 mV/g"
        raise _bad("full_scale", what, f'write sensitivity = "{example}" beside it')
    per_unit = _above_zero(sensitivity, f"{quantity}_sensitivity", "sensitivity")
    if full_scale is None:
        return 1 / per_unit if in_volts else None
    return _above_zero(full_scale, "voltage", "full_scale") / per_unit


def _without_per_unit(scale: object) -> object:
    if not isinstance(scale, str):
        return scale
    spoken = " ".join(scale.split())
    return spoken.removesuffix("/unit").removesuffix("per unit").rstrip()


def _above_zero(value: object, dimension: str, key: str) -> float:
    try:
        si = parse(value, dimension)
    except InputError as error:
        raise error.at(field=key) from None
    if si <= 0:
        what = f"{quoted(value)} is not above zero"
        raise _bad(key, what, "write what one unit of the file stands for")
    return si


def _bad(key: str, what: str, remedy: str) -> InputError:
    return InputError(what, remedy, Place(field=key))
