"""What each kind of support is worth in stiffness, and how sure one can be of it.

The table is common practice, no source: medians for a 4-inch pipe, scaled with the outside
diameter; the doubt is the standard deviation of the natural logarithm. Measured stiffness of
clamps with their structure on compressor piping, 17.5 to 175 MN/m, brackets the clamp row
(GMRC research summary on pipe support stiffness, 2014).
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import InputError, Place
from fieldkit.span.header import SHELL_SD_LN, shell_rotation_n_m_per_rad
from fieldkit.span.layout import Believed, Span, Stiffness, Support, axis_vectors, is_vertical

REFERENCE_DIAMETER_M = 0.1143
RIGID_N_PER_M = 1e12
RIGID_N_M_PER_RAD = 1e12
_TRANSLATIONS = ("vertical", "lateral", "axial", "x", "y", "z")
_SAME_LINE = 0.99
"""Cosine above which two directions are one."""
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
    """Turns with the pipe: on a riser it holds both horizontals as across a level pipe, and z as
    along one."""
    structural: bool = True
    """Whether a stiffer version of it is a sensible change."""


def _kinds(*kinds: SupportKind) -> dict[str, SupportKind]:
    return {kind.name: kind for kind in kinds}


_D = Doubtful
KINDS = _kinds(
    SupportKind("anchor", _D(5e8, 0.6), _D(5e8, 0.6), _D(5e8, 0.6), _D(5, 1.8), grips_pipe=True),
    SupportKind(
        "nozzle", _D(3e7, 1.4), _D(3e7, 1.4), _D(3e7, 1.4), _D(1, 1.8),
        grips_pipe=True, structural=False,
    ),
    SupportKind("clamp", _D(1.5e7, 1.3), _D(8e6, 1.3), _D(8e6, 1.4), _D(0.4, 1.8), grips_pipe=True),
    SupportKind("u-bolt", _D(6e6, 1.6), _D(2e6, 1.6), _D(2e5, 1.7), _D(0.05, 1.8), grips_pipe=True),
    SupportKind("guide", _D(4e6, 1.4), _D(4e6, 1.4), None, None, grips_pipe=True),
    SupportKind("rest", _D(6e6, 1.6), _D(2e5, 1.6), _D(2e5, 1.6), None, grips_pipe=False),
    SupportKind(
        "hanger", _D(8e5, 1.3), _D(2e4, 1.3), _D(2e4, 1.3), None, grips_pipe=False, structural=False
    ),
    SupportKind(
        "branch", _D(5e8, 0.6), _D(5e8, 0.6), _D(5e8, 0.6), _D(1, 1.8),
        grips_pipe=True, structural=False,
    ),
    SupportKind("brace", _D(3e6, 1.3), _D(3e6, 1.3), _D(3e6, 1.4), None, grips_pipe=True),
    SupportKind("free", None, None, None, None, grips_pipe=False, structural=False),
)  # fmt: skip


@dataclass(frozen=True)
class Spring:
    """One resolved stiffness of a support."""

    support: int
    at_m: float
    axis: str
    """A name of ``layout.AXES`` or ``torsion`` (about the pipe's own axis); ``rotation`` and
    ``torsion`` are in N m/rad, the others in N/m."""
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
    tangent = span.centre_line.at(support.at_m)[1]
    implied = _implied(_kind(support, index), is_vertical(tangent))
    found = []
    for axis in ("vertical", "lateral", "axial", "rotation", "x", "y", "z"):
        stated: Stiffness = getattr(support, axis)
        known, unit = _known(span, support, axis, implied.get(axis))
        resolved = _resolve(stated, known, unit, axis)
        if resolved is None:
            continue
        kept = _left_to_imply(support, axis, tangent) if stated == "implied" else (axis,)
        found += [Spring(index, support.at_m, name, *resolved) for name in kept]
    return found + _torsion(span, index)


def _kind(support: Support, index: int) -> SupportKind:
    if support.kind not in KINDS:
        raise InputError(
            f"no support is called {support.kind!r}",
            f"use one of {', '.join(KINDS)}",
            Place(field=f"support[{index}].kind"),
        )
    return KINDS[support.kind]


def on_header(span: Span) -> bool:
    """Whether the span is a branch on a header, so that what holds it belongs on the header."""
    return any(support.kind in ("branch", "brace") for support in span.supports)


def _known(
    span: Span, support: Support, axis: str, implied: Doubtful | None
) -> tuple[Doubtful | None, float]:
    """What is believed of one axis and what 1 of it stands for.

    A fitting on a header of known size turns with the header's shell.
    """
    if axis == "rotation" and support.header is not None:
        modulus = span.material.modulus_pa[0][1]
        turning = shell_rotation_n_m_per_rad(support.header, span.pipe, modulus)
        return Doubtful(turning, SHELL_SD_LN), 1.0
    return implied, _unit(span, support, axis)


def _left_to_imply(support: Support, axis: str, tangent: NDArray[np.float64]) -> tuple[str, ...]:
    """What is left of an implied axis once every direction stated on the support is taken out.

    The kind speaks only where the job does not: ``z`` stated on a level pipe replaces the implied
    ``vertical``, ``vertical`` stated on a riser the implied ``axial``, ``x`` one half of a
    riser's ``lateral``.
    """
    if axis == "rotation":
        return (axis,)
    stated = [n for n in _TRANSLATIONS if n != axis and getattr(support, n) != "implied"]
    taken = [row for name in stated for row in axis_vectors(tangent, name)]
    rows = axis_vectors(tangent, axis)
    open_rows = [row for row in rows if all(abs(row @ other) < _SAME_LINE for other in taken)]
    if len(open_rows) == len(rows):
        return (axis,)
    return tuple("xyz"[int(np.argmax(np.abs(row)))] for row in open_rows)


def _torsion(span: Span, index: int) -> list[Spring]:
    """Hold on the pipe against turning about its own axis, by supports that grip it all round.

    As stiff as their hold against turning across the pipe (4 EI/L is 5.2 GJ/L): common practice,
    no source. It is doubtful only where it matters, that is where a bend or an offset mass couples
    twist with bending; on any other span it is taken as known.
    """
    support = span.supports[index]
    implied = KINDS[support.kind].rotation
    if implied is None and support.torsion == "implied":
        return []
    unit = _unit(span, support, "rotation")
    stated = support.torsion
    if stated == "implied" and support.rotation != 0:
        stated = support.rotation
    resolved = _resolve(stated, implied, unit, "rotation")
    if resolved is None:
        return []
    stiffness, sd_ln = resolved
    return [Spring(index, support.at_m, "torsion", stiffness, sd_ln if _twists(span) else 0.0)]


def _twists(span: Span) -> bool:
    return len(span.legs) > 1 or any(any(mass.offset_m) for mass in span.masses)


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
    if isinstance(stated, Believed):
        return (stated.median, stated.sd_ln) if stated.median > 0 else None
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
    """Mean distance to the next supports (or the ends) on either side.

    Supports that the job states in full (kind ``free``) do not count, so that adding one leaves
    what the others are worth as it was.
    """
    others = [s.at_m for s in span.supports if s.kind != "free"]
    stations = sorted({0.0, span.length_m, support.at_m, *others})
    gaps = [b - a for a, b in pairwise(stations) if b - a > 1e-6]
    beside = [
        b - a
        for a, b in pairwise(stations)
        if b - a > 1e-6 and min(abs(a - support.at_m), abs(b - support.at_m)) < 1e-6
    ]
    chosen = beside or gaps
    return sum(chosen) / len(chosen)
