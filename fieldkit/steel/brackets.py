"""Brackets and how long they may be for the stiffness that is needed.

Every bracket is a small plane frame on springs for what it stands on, in series with the clamp
that holds the pipe. Loads meet every section without twisting it (a channel at its shear centre), a
brace is a bar with pinned ends, and the bracket's own mass is left out. Pure stiffness: strength of
steel, welds and anchors is for the designer.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from fieldkit.steel.frames import Base, Member, compliance
from fieldkit.steel.sections import Section, sections

Array = NDArray[np.float64]

MODULUS_PA = 210e9
SHEAR_MODULUS_PA = 81e9
"""Structural steel, EN 1993-1-1 (from memory)."""
CLAMP_N_PER_M = 1e8
"""Two-bolt flat clamp, tight, on a 4-inch pipe; in proportion to the diameter (common practice, no
source; with its structure a clamp measures 17.5 to 175 MN/m)."""
BASE_N_PER_M = 2e8
"""One base plate bolted or welded to heavy steel or concrete, each way (common practice, no
source). Its plate is twice the section's depth, half of the stiffness at either edge, so that it
resists turning with BASE_N_PER_M * depth^2."""
HEADER_BASE_N_PER_M = 4e7
"""The same on the wall of a header (common practice, no source)."""
REFERENCE_DIAMETER_M = 0.1143
PORTAL_CLEARANCE_M = 0.3
"""Width of a portal beyond the pipe."""
MOST_SLENDER = 150.0
"""Length over least radius of gyration (common practice, no source)."""
REACH_M = 0.5
"""From what the bracket stands on to the pipe, where the job does not know."""
LENGTHS_M = np.geomspace(0.05, 4.0, 60)

Drawn = tuple[Array, tuple[tuple[int, int, float], ...]]
"""Node coordinates (B, N, 2), and members (start, end, share of E I)."""


@dataclass(frozen=True)
class Form:
    """A kind of bracket."""

    name: str
    told: str
    frame: Callable[[Array, float], Drawn]
    """From length (B,) and pipe diameter, metres."""
    bases: tuple[int, ...]
    loaded: int
    mass_lengths: Callable[[float, float], float]
    """Metres of steel for a length and a pipe diameter."""


def _nodes(length: Array, *points: tuple[float | Array, float | Array]) -> Array:
    zero = np.zeros_like(length)
    return np.stack([np.stack([zero + x, zero + y], axis=1) for x, y in points], axis=1)


def _arm(length: Array, _pipe: float) -> Drawn:
    return _nodes(length, (0, 0), (length, 0)), ((0, 1, 1.0),)


def _post(length: Array, _pipe: float) -> Drawn:
    return _nodes(length, (0, 0), (0, length)), ((0, 1, 1.0),)


def _knee(length: Array, _pipe: float) -> Drawn:
    return _nodes(length, (0, 0), (length, 0), (0, -length)), ((0, 1, 1.0), (2, 1, 0.0))


def _portal(length: Array, pipe: float) -> Drawn:
    width = pipe + PORTAL_CLEARANCE_M
    nodes = _nodes(length, (0, 0), (0, length), (width / 2, length), (width, length), (width, 0))
    return nodes, ((0, 1, 1.0), (1, 2, 1.0), (2, 3, 1.0), (3, 4, 1.0))


FORMS = (
    Form(
        "cantilever", "arm from a wall or column, across the pipe", _arm, (0,), 1,
        lambda length, _: length,
    ),
    Form("post", "post on the floor, under the pipe", _post, (0,), 1, lambda length, _: length),
    Form(
        "braced", "arm with a brace of the same section at 45 degrees to its tip", _knee, (0, 2), 1,
        lambda length, _: length * (1 + 2**0.5),
    ),
    Form(
        "portal", "two posts and a beam under the pipe", _portal, (0, 4), 2,
        lambda length, pipe: 2 * length + pipe + PORTAL_CLEARANCE_M,
    ),
)  # fmt: skip


@dataclass(frozen=True)
class Bracket:
    """A bracket that has the stiffness needed."""

    form: str
    told: str
    section: str
    standard: str
    longest_m: float
    """From what it stands on to the centre of the pipe (portal: height)."""
    at_m: float
    """Length that ``mass_kg`` and the stiffnesses are for: the reach wanted, or the longest."""
    reaches: bool
    """Whether the reach wanted is within the longest length."""
    mass_kg: float
    vertical_n_per_m: float
    lateral_n_per_m: float


def bracket_stiffness(
    form: Form, section: Section, length_m: Array, pipe_m: float, base_n_per_m: float = BASE_N_PER_M
) -> Array:
    """(B, 2) vertical and lateral N/m at the pipe, clamp and base included."""
    one = np.ones_like(length_m)
    nodes, joined = form.frame(length_m, pipe_m)
    members = tuple(
        Member(
            start,
            end,
            MODULUS_PA * section.area_m2 * one,
            share * MODULUS_PA * section.bending_m4 * one,
            SHEAR_MODULUS_PA * section.shear_m2 * one,
        )
        for start, end, share in joined
    )
    turning = base_n_per_m * section.depth_m**2
    bases = tuple(Base(node, base_n_per_m * one, turning * one) for node in form.bases)
    give = compliance(nodes, members, bases, form.loaded)[:, ::-1] + 1 / clamp_n_per_m(pipe_m)
    return np.asarray(1 / give)


def clamp_n_per_m(pipe_m: float) -> float:
    """The clamp alone."""
    return CLAMP_N_PER_M * pipe_m / REFERENCE_DIAMETER_M


@lru_cache(maxsize=32)
def _table(pipe_m: float, base_n_per_m: float, units: str) -> tuple[Array, ...]:
    """For each form (sections, lengths, 2) N/m."""
    return tuple(
        np.stack(
            [
                bracket_stiffness(form, section, LENGTHS_M, pipe_m, base_n_per_m)
                for section in sections(units)
            ]
        )
        for form in FORMS
    )


def brackets(
    vertical_n_per_m: float,
    lateral_n_per_m: float,
    pipe_m: float,
    *,
    reach_m: float = REACH_M,
    base_n_per_m: float = BASE_N_PER_M,
    units: str = "SI",
) -> tuple[Bracket, ...]:
    """Of each form the lightest section that is stiff enough at ``reach_m``, lightest first.

    Where no section reaches as far, the one that reaches farthest; a form none of whose sections is
    stiff enough at any length is left out. A direction that needs no stiffness is 0.
    """
    wanted = np.array([vertical_n_per_m, lateral_n_per_m])
    found = []
    for form, table in zip(FORMS, _table(pipe_m, base_n_per_m, units), strict=True):
        choice = _lightest(form, table, wanted, pipe_m, reach_m, sections(units))
        if choice is None:
            continue
        section, longest = choice
        at = min(reach_m, longest)
        own = bracket_stiffness(form, section, np.array([at]), pipe_m, base_n_per_m)[0]
        mass = section.mass_kg_per_m * form.mass_lengths(at, pipe_m)
        found.append(
            Bracket(
                form.name,
                form.told,
                section.name,
                section.standard,
                longest,
                at,
                longest >= reach_m,
                mass,
                float(own[0]),
                float(own[1]),
            )
        )
    return tuple(sorted(found, key=lambda b: (not b.reaches, b.mass_kg)))


def _lightest(
    form: Form, table: Array, wanted: Array, pipe_m: float, reach_m: float,
    choices: tuple[Section, ...],
) -> tuple[Section, float] | None:  # fmt: skip
    longest = [longest_m(row, wanted, section) for row, section in zip(table, choices, strict=True)]
    reaching = [i for i, length in enumerate(longest) if length >= reach_m]
    if reaching:
        best = min(reaching, key=lambda i: choices[i].mass_kg_per_m)
    else:
        best = max(range(len(choices)), key=lambda i: longest[i])
    return (choices[best], longest[best]) if longest[best] > 0 else None


def longest_m(stiffness: Array, wanted: Array, section: Section) -> float:
    """Longest length (interpolated in logarithms) at which both directions suffice; 0 where none.

    ``stiffness`` is (lengths, 2) over LENGTHS_M; it falls with length, but for a sway of a short
    portal's legs that stiffens its beam by 3 % at most.
    """
    limit = MOST_SLENDER * section.least_radius_m
    for axis in range(2):
        if wanted[axis] <= 0:
            continue
        k = np.log(np.minimum.accumulate(stiffness[:, axis]))
        if k[0] < np.log(wanted[axis]):
            return 0.0
        at = np.interp(-np.log(wanted[axis]), -k, np.log(LENGTHS_M))
        limit = min(limit, float(np.exp(at)))
    return min(limit, float(LENGTHS_M[-1]))
