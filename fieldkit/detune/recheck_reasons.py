"""Why a pipe rings elsewhere than promised, most likely first, each with what to look at."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.recheck_answer import AsFound, Reason
from fieldkit.detune.recheck_joint import Joint
from fieldkit.detune.recheck_spans import (
    AS_DRAWN,
    LOOSE,
    MASS,
    NOTHING,
    OTHER,
    PLACE,
    STIFFNESS,
    Installed,
)
from fieldkit.detune.recheck_ways import Weighed
from fieldkit.quantity import show

Array = NDArray[np.float64]

LEAST = 0.01
"""A reason less likely than this is not worth a walk."""
INFORMED_SD = 0.75
DIMENSIONS = {"N/m": "stiffness", "N m/rad": "rotational_stiffness", "kg": "mass", "m": "length"}

CHECK = {
    AS_DRAWN: "nothing to look for: one mode in ten lies outside its 90 % interval by chance; "
    "tap once more where it is outside",
    STIFFNESS: "put the sensor on the bracket, then on what it stands on, and tap the pipe: what "
    "moves along with the pipe is the soft part; look at the base plate, the anchors, the length "
    "of the cantilever and a liner under the clamp",
    NOTHING: "see whether the change was in place and tightened when this was recorded, and "
    "whether these are the recordings made after it",
    LOOSE: "try the bolts, look for a gap under the shoe or a U-bolt that lets the pipe move; a "
    "loose support rattles, and its frequency falls when the blow is harder",
    PLACE: "measure where the middle of the change sits, along the pipe from the same end",
    MASS: "weigh or look up what rides on the pipe now: clamp, bracket, valve, and whether the "
    "line was as full as described",
    OTHER: "move the sensor along the pipe and tap in the other direction: a mode of this span "
    "grows and shrinks along it, a neighbour or the bracket itself does not",
}


def reasons(
    probability: Mapping[str, float],
    false_share: float,
    found: Mapping[str, tuple[AsFound, ...]],
    units: str,
) -> tuple[Reason, ...]:
    """Ranked by probability; ``false_share`` is how likely a peak outside is none of the span's
    where the change stands as drawn, ``found`` what each way says of the change."""
    shares = dict(probability)
    drawn = shares.get(AS_DRAWN, 0.0)
    shares[AS_DRAWN] = drawn * (1 - false_share)
    shares[OTHER] = shares.get(OTHER, 0.0) + drawn * false_share
    listed = [
        Reason(name, share, _says(name, found.get(name, ()), units), CHECK[name])
        for name, share in shares.items()
        if share >= LEAST
    ]
    return tuple(sorted(listed, key=lambda reason: -reason.probability))


def _says(name: str, found: Sequence[AsFound], units: str) -> str:
    if name == STIFFNESS:
        return _stiffness(found, units)
    if name == PLACE:
        return "it stands elsewhere than drawn" + _listed(found, "m", units)
    if name == MASS:
        return "another mass rides on the pipe than assumed" + _listed(found, "kg", units)
    return {
        AS_DRAWN: "it stands as drawn, and a mode lies outside by chance",
        NOTHING: "nothing of the change shows: the pipe rings as it did before",
        LOOSE: "the support holds nothing: it hangs loose",
        OTHER: "a peak that lies outside belongs to another mode, a neighbour or the bracket",
    }[name]


def _stiffness(found: Sequence[AsFound], units: str) -> str:
    """How stiff, in words: the directions the re-tap speaks of."""
    told = [f for f in found if f.unit in ("N/m", "N m/rad")]
    spoken = [f for f in told if f.informed] or told
    softer = all(f.median < f.drawn for f in spoken)
    word = "less stiff than" if softer else "not as stiff as"
    if spoken and all(f.median > f.drawn for f in spoken):
        word = "stiffer than"
    return f"the support is {word} drawn: " + ", ".join(as_found(f, units) for f in spoken)


def _listed(found: Sequence[AsFound], unit: str, units: str) -> str:
    told = [as_found(f, units) for f in found if f.unit == unit]
    return f": {', '.join(told)}" if told else ""


def name_of(found: AsFound, units: str) -> str:
    """What a value is, in the units of the job."""
    if found.at_m is None:
        return found.name
    at = show(found.at_m, "length", units, 3)
    return f"further along than {at}" if found.name == "place" else f"{found.name} at {at}"


def as_found(found: AsFound, units: str) -> str:
    """A value of the change as found against as drawn, in the units of the job."""
    dimension = DIMENSIONS[found.unit]
    name = name_of(found, units)
    low, high = (show(value, dimension, units, 2) for value in (found.low, found.high))
    if found.unit in ("N/m", "N m/rad"):
        share = f"{100 * found.median / found.drawn:.0f} %"
        drawn = show(found.drawn, dimension, units, 2)
        return f"{name} {low} to {high}, about {share} of the {drawn} drawn"
    return f"{name}, {low} to {high}"


def found_of(
    way: Installed, joint: Joint, z: Array, weight: Array | None = None
) -> tuple[AsFound, ...]:
    """What members (members, joint) say of everything the change brought."""
    share = np.full(len(z), 1 / len(z)) if weight is None else weight
    several = len({support for support, _ in way.own_springs}) > 1
    told = []
    for j in joint.own:
        key, unknown = joint.keys[j], joint.unknowns[j]
        value: Array = unknown.at(z[:, j])
        drawn = unknown.centre
        name, unit, at_m = unknown.name, unknown.unit, None
        if key[0] == "place":
            value, drawn = value - 1.0, 0.0
            name, at_m = "place", float(str(key[1]))
        elif key[1] == "spring":
            support, axis = int(str(key[2])), str(key[3])
            drawn = way.own_springs[(support, axis)]
            name, at_m = axis, way.after.supports[support].at_m if several else None
        low, median, high = weighted_quantiles(value, share)
        mean = float(share @ z[:, j])
        sd = float(share @ (z[:, j] - mean) ** 2) ** 0.5
        told.append(AsFound(name, unit, drawn, low, median, high, sd < INFORMED_SD, at_m))
    return tuple(told)


def found_in(weighed: Weighed) -> tuple[AsFound, ...]:
    """The same from the weighted draws of one way."""
    return found_of(weighed.way.found, weighed.way.joint, weighed.z, weighed.weight)


def weighted_quantiles(value: Array, weight: Array) -> tuple[float, float, float]:
    """5 %, median and 95 % of weighted values."""
    order = np.argsort(value)
    reached = np.cumsum(weight[order]) - 0.5 * weight[order]
    low, median, high = (float(np.interp(p, reached, value[order])) for p in (0.05, 0.5, 0.95))
    return low, median, high
