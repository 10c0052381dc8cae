"""What each kind of support is worth in stiffness, and how sure one can be of it.

The table is common practice, no source: medians for a 4-inch pipe, scaled with the outside
diameter; the doubt is the standard deviation of the natural logarithm. Measured stiffness of
clamps with their structure on compressor piping, 17.5 to 175 MN/m, brackets the clamp row
(GMRC research summary on pipe support stiffness, 2014).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from fieldkit.span.layout import Span, Stiffness, Support, is_vertical

REFERENCE_DIAMETER_M = 0.1143
RIGID_N_PER_M = 1e12
RIGID_N_M_PER_RAD = 1e12
UNKNOWN_SD_LN = 1.7
"""Least doubt behind the word ``unknown``: about three decades between -2 and +2 deviations."""


@dataclass(frozen=True)
class Doubtful:
    """A stiffness with its doubt; the rotation entry counts in 4 EI/L of the span beside it."""

    median: float
    sd_ln: float


@dataclass(frozen=True)
class SupportKind:
    """What a kind of support restrains."""

    name: str
    vertical: Doubtful | None
    lateral: Doubtful | None
    axial: Doubtful | None
    rotation: Doubtful | None
    grips_pipe: bool
    """Turns with the pipe: on a riser it holds both horizontals like ``lateral``, z like ``axial``."""
    structural: bool = True
    """Whether a stiffer version of it is a sensible change."""


KINDS: dict[str, SupportKind] = {
    kind.name: kind
    for kind in (
        SupportKind(
            "anchor", Doubtful(5e8, 0.6), Doubtful(5e8, 0.6), Doubtful(5e8, 0.6), Doubtful(5, 1.8),
            grips_pipe=True,
        ),
        SupportKind(
            "nozzle", Doubtful(3e7, 1.4), Doubtful(3e7, 1.4), Doubtful(3e7, 1.4), Doubtful(1, 1.8),
            grips_pipe=True, structural=False,
        ),
        SupportKind(
            "clamp", Doubtful(1.5e7, 1.3), Doubtful(8e6, 1.3), Doubtful(8e6, 1.4), Doubtful(0.4, 1.8),
            grips_pipe=True,
        ),
        SupportKind(
            "u-bolt", Doubtful(6e6, 1.6), Doubtful(2e6, 1.6), Doubtful(2e5, 1.7), Doubtful(0.05, 1.8),
            grips_pipe=True,
        ),
        SupportKind("guide", Doubtful(4e6, 1.4), Doubtful(4e6, 1.4), None, None, grips_pipe=True),
        SupportKind(
            "rest", Doubtful(6e6, 1.6), Doubtful(2e5, 1.6), Doubtful(2e5, 1.6), None, grips_pipe=False
        ),
        SupportKind(
            "hanger", Doubtful(8e5, 1.3), Doubtful(2e4, 1.3), Doubtful(2e4, 1.3), None,
            grips_pipe=False,
        ),
        SupportKind("free", None, None, None, None, grips_pipe=False, structural=False),
    )
}  # fmt: skip


@dataclass(frozen=True)
class Spring:
    """One resolved stiffness of a support."""

    support: int
    at_m: float
    axis: str
    """A name of ``layout.AXES``; ``rotation`` is in N m/rad, the others in N/m."""
    stiffness: float
    """Median."""
    sd_ln: float
    """0 where the job states the stiffness."""


def springs(span: Span) -> tuple[Spring, ...]:
    """Every stiffness the supports of a span put on the pipe, in order of support."""
    return tuple(
        spring for index in range(len(span.supports)) for spring in _springs_of(span, index)
    )


def _springs_of(span: Span, index: int) -> list[Spring]:
    support = span.supports[index]
    kind = KINDS[support.kind]
    riser = is_vertical(span.centre_line.at(support.at_m)[1])
    implied = _implied(kind, riser)
    found = []
    for axis in ("vertical", "lateral", "axial", "rotation", "x", "y", "z"):
        stated: Stiffness = getattr(support, axis)
        resolved = _resolve(stated, implied.get(axis), _unit(span, support, axis), axis)
        if resolved is not None:
            found.append(Spring(index, support.at_m, axis, *resolved))
    return found


def _implied(kind: SupportKind, riser: bool) -> dict[str, Doubtful | None]:
    """What a kind restrains by axis; on a riser vertical and axial are one and the same."""
    by_axis = {"lateral": kind.lateral, "rotation": kind.rotation}
    if not riser:
        return by_axis | {"vertical": kind.vertical, "axial": kind.axial}
    if kind.grips_pipe:
        return by_axis | {"lateral": _weaker(kind.vertical, kind.lateral), "axial": kind.axial}
    return by_axis | {"vertical": kind.vertical}


def _weaker(a: Doubtful | None, b: Doubtful | None) -> Doubtful | None:
    known = [d for d in (a, b) if d is not None]
    return min(known, key=lambda d: d.median) if known else None


def _resolve(
    stated: Stiffness, implied: Doubtful | None, unit: float, axis: str
) -> tuple[float, float] | None:
    """(median, sd_ln) in SI, or None where there is no restraint."""
    if stated == "implied":
        return (implied.median * unit, implied.sd_ln) if implied else None
    if stated == "unknown":
        known = implied or _FALLBACK["rotation" if axis == "rotation" else "translation"]
        return known.median * unit, max(known.sd_ln, UNKNOWN_SD_LN)
    rigid = RIGID_N_M_PER_RAD if axis == "rotation" else RIGID_N_PER_M
    return (min(float(stated), rigid), 0.0) if float(stated) > 0 else None


_FALLBACK = {"translation": Doubtful(2e6, UNKNOWN_SD_LN), "rotation": Doubtful(0.2, UNKNOWN_SD_LN)}
"""Where the kind implies nothing but the job says ``unknown``."""


def _unit(span: Span, support: Support, axis: str) -> float:
    """What 1 in the table stands for on this pipe."""
    if axis != "rotation":
        return span.pipe.outside_diameter_m / REFERENCE_DIAMETER_M
    modulus = span.material.modulus_pa[0][1]
    return 4 * modulus * span.pipe.second_moment_m4 / _neighbour_distance(span, support)


def _neighbour_distance(span: Span, support: Support) -> float:
    """Mean distance to the next supports (or the ends) on either side."""
    stations = sorted({0.0, span.length_m, *(s.at_m for s in span.supports)})
    gaps = [b - a for a, b in zip(stations, stations[1:], strict=False) if b - a > 1e-6]
    beside = [
        b - a
        for a, b in zip(stations, stations[1:], strict=False)
        if b - a > 1e-6 and (math.isclose(a, support.at_m) or math.isclose(b, support.at_m))
    ]
    chosen = beside or gaps
    return sum(chosen) / len(chosen)
