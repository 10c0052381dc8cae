"""Handbook frequency of one straight gap of a span: formula, bracket and source.

The bracket runs from ends free to turn to ends that cannot, the supports rigid in translation.
Where ends free to turn leave a mechanism (cantilevers) or have no published factor (bent spans),
it begins at 0.6 of the fixed frequency: real clamps reach 0.6 to 0.9 of it (from memory).
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

from fieldkit.span import eigenvalues
from fieldkit.span.gaps import Gap, UniformPipe
from fieldkit.span.rayleigh import UniformSpan, loaded_span_hz

THOMSON = "Thomson, Theory of Vibration with Applications, appendix D"
RAYLEIGH = "Rayleigh's method (Thomson, Theory of Vibration with Applications, from memory)"
EXACT_MASS = "exact beam equation; Rayleigh's short form agrees (Thomson; Rao; from memory)"
TIP_MASS = "exact beam equation; values as in Mathematical Problems in Engineering 2017, 1568019"
ROCKING = "Southwell-Dunkerley sum of a fixed cantilever and a rigid one on its root (from memory)"
LOOSEST_GRIP = 0.6
STIFF_ENOUGH = 2.0
"""Support stiffness over that of the span: Wachel, Morton & Atkins 1990 (from memory)."""

_ENDS = {(0, 0): "pinned-pinned", (1, 0): "clamped-pinned", (0, 1): "pinned-clamped"}


@dataclass(frozen=True)
class HandbookEstimate:
    """What a handbook says of the first mode of a span."""

    frequency_hz: float
    """Best estimate for the kinds of support there are."""
    low_hz: float
    high_hz: float
    formula: str
    """With its symbols and their values, to be followed by hand."""
    source: str
    note: str
    """Assumptions and limits, in words."""


def between_holds(
    gap: Gap, pipe: UniformPipe, left_fixity: float, right_fixity: float
) -> HandbookEstimate:
    """Straight gap held at both ends, with any point masses."""
    found = math.fsum(
        weight * math.sqrt(_held_hz(gap, pipe, *corner))
        for corner, weight in _corners(left_fixity, right_fixity)
    )
    low, high = _held_hz(gap, pipe, 0, 0), _held_hz(gap, pipe, 1, 1)
    frequency = min(max(found**2, low), high)
    eigenvalue = math.sqrt(frequency / unit_hz(gap.length_m, pipe))
    ends = _ends_in_words(left_fixity, right_fixity)
    if gap.masses:
        formula, source = _mass_formula(gap, ends)
    else:
        formula = f"f = b^2/(2 pi L^2) sqrt(EI/m), b = {eigenvalue:.4f} ({ends})"
        source = THOMSON
    return HandbookEstimate(
        frequency,
        low,
        high,
        f"{formula}; {pipe_data(gap.length_m, pipe)}",
        source,
        "bracket: both ends pinned to both ends fixed, supports that do not give way",
    )


def cantilever(
    gap: Gap, pipe: UniformPipe, root_ratio: float, low_root_ratio: float
) -> HandbookEstimate:
    """Straight overhang with any masses; k_r L/EI of its root as likely and as soft as may be.

    Either ratio may be infinite (fixed); an infinite ``low_root_ratio`` stands for a grip of
    unknown stiffness.
    """
    overhang = gap if gap.left is not None else _mirrored(gap)
    fixed = _fixed_cantilever_hz(overhang, pipe)
    rocking = _rocking_hz(overhang, pipe, 1.0)
    likely = min(_joined(fixed, rocking * math.sqrt(root_ratio)), fixed)
    if math.isinf(low_root_ratio):
        low = LOOSEST_GRIP * fixed
        why = "low end: a root as soft as real clamps, 0.6 of fixed; a thin header is softer still"
    else:
        low = _joined(fixed, rocking * math.sqrt(low_root_ratio))
        why = "low end: only the pipe behind the last support holds the root"
    formula, source = _cantilever_formula(overhang)
    if not math.isinf(root_ratio):
        formula = (
            f"1/f^2 = 1/f_c^2 + 1/f_r^2, f_r = sqrt(k_r/I)/(2 pi), I = m L^3/3 + sum(M x^2), "
            f"k_r = {root_ratio:.2f} EI/L; {formula}"
        )
        source = f"{source}; {ROCKING}"
    return HandbookEstimate(
        likely,
        min(low, likely),
        fixed,
        f"{formula}; {pipe_data(gap.length_m, pipe)}",
        source,
        why,
    )


def stiff_enough(gap: Gap, pipe: UniformPipe) -> float:
    """Stiffness in N/m from which a support is all but rigid: twice 48 EI/L^3, 3 on an overhang."""
    own = 48 if gap.left is not None and gap.right is not None else 3
    return STIFF_ENOUGH * own * pipe.bending_n_m2 / gap.length_m**3


def pinned_hz(gap: Gap, pipe: UniformPipe) -> float:
    """First mode of a straight gap between pinned ends, with its point masses."""
    return _held_hz(gap, pipe, 0, 0)


def unit_hz(length_m: float, pipe: UniformPipe) -> float:
    """Frequency of the eigenvalue 1."""
    return eigenvalues.frequency_hz(1.0, length_m, pipe.bending_n_m2, pipe.mass_kg_per_m)


def _corners(left: float, right: float) -> list[tuple[tuple[int, int], float]]:
    """Pinned and fixed pairs of ends and their weights in the eigenvalue."""
    weights = {
        (0, 0): (1 - left) * (1 - right),
        (1, 0): left * (1 - right),
        (0, 1): (1 - left) * right,
        (1, 1): left * right,
    }
    return [(corner, weight) for corner, weight in weights.items() if weight > 0]


def _held_hz(gap: Gap, pipe: UniformPipe, left: int, right: int) -> float:
    ends = _ENDS.get((left, right), "clamped-clamped")
    mu = gap.mass_kg / (pipe.mass_kg_per_m * gap.length_m)
    if _in_the_middle(gap) and left == right:
        with_mass = (
            eigenvalues.clamped_with_centre_mass if left else eigenvalues.pinned_with_centre_mass
        )
        return float(with_mass(mu, 1)[0]) ** 2 * unit_hz(gap.length_m, pipe)
    span = UniformSpan(gap.length_m, pipe.bending_n_m2, pipe.mass_kg_per_m)
    return loaded_span_hz(span, ends, gap.masses)


def _in_the_middle(gap: Gap) -> bool:
    return len(gap.masses) == 1 and abs(gap.masses[0][0] - 0.5) < 0.01


def _at_the_tip(gap: Gap) -> bool:
    return len(gap.masses) == 1 and gap.masses[0][0] > 0.99


def _mirrored(gap: Gap) -> Gap:
    """A gap free on its left seen from the other end."""
    masses = tuple((1 - share, kg) for share, kg in reversed(gap.masses))
    return replace(gap, left=gap.right, right=gap.left, legs=gap.legs[::-1], masses=masses)


def _fixed_cantilever_hz(gap: Gap, pipe: UniformPipe) -> float:
    if _at_the_tip(gap):
        mu = gap.mass_kg / (pipe.mass_kg_per_m * gap.length_m)
        b = float(eigenvalues.cantilever_with_tip_mass(mu, 1)[0])
        return b**2 * unit_hz(gap.length_m, pipe)
    span = UniformSpan(gap.length_m, pipe.bending_n_m2, pipe.mass_kg_per_m)
    return loaded_span_hz(span, "clamped-free", gap.masses)


def _rocking_hz(gap: Gap, pipe: UniformPipe, root_ratio: float) -> float:
    """A rigid cantilever that turns about its root."""
    inertia = pipe.mass_kg_per_m * gap.length_m**3 / 3
    inertia += sum(kg * (share * gap.length_m) ** 2 for share, kg in gap.masses)
    stiffness = root_ratio * pipe.bending_n_m2 / gap.length_m
    return math.sqrt(stiffness / inertia) / (2 * math.pi)


def _joined(first_hz: float, second_hz: float) -> float:
    """1/f^2 = 1/f1^2 + 1/f2^2."""
    return 1 / math.hypot(1 / first_hz, 1 / second_hz)


def _mass_formula(gap: Gap, ends: str) -> tuple[str, str]:
    if _in_the_middle(gap):
        text = (
            f"f = b^2/(2 pi L^2) sqrt(EI/m), mu = M/(m L), l = b/2; pinned: "
            f"tan l - tanh l = 4/(mu b), fixed: 2 (cos l sinh l + sin l cosh l) = "
            f"mu b (1 - cos l cosh l); {ends}; {_masses(gap)}"
        )
        return text, EXACT_MASS
    text = (
        "f = sqrt(g sum(W d)/sum(W d^2))/(2 pi), d the deflection under the weight W of pipe and "
        f"masses, or f = f_bare/sqrt(1 + sum(M y^2)/int(m y^2 dx)), y the bare mode, if lower; "
        f"{ends}; {_masses(gap)}"
    )
    return text, RAYLEIGH


def _cantilever_formula(gap: Gap) -> tuple[str, str]:
    if not gap.masses:
        return "f_c = b^2/(2 pi L^2) sqrt(EI/m), b = 1.8751 (cantilever)", THOMSON
    if _at_the_tip(gap):
        text = (
            "f_c = b^2/(2 pi L^2) sqrt(EI/m), 1 + cos b cosh b = mu b (sin b cosh b - cos b sinh b)"
            ", mu = M/(m L); in short sqrt(3 EI/(L^3 (M + 0.2357 m L)))/(2 pi); "
        )
        return text + _masses(gap), TIP_MASS
    formula, source = _mass_formula(gap, "cantilever")
    return f"f_c by {formula}", source


def _ends_in_words(left: float, right: float) -> str:
    names = {0.0: "pinned", 1.0: "fixed"}
    if left in names and right in names:
        return f"{names[left]}-{names[right]}"
    return f"b weighted between pinned and fixed ends, fixity {left:.2f} and {right:.2f}"


def _masses(gap: Gap) -> str:
    places = [f"{kg:.4g} kg at {share * gap.length_m:.2f} m" for share, kg in gap.masses]
    return "M = " + ", ".join(places)


def pipe_data(length_m: float, pipe: UniformPipe) -> str:
    """Length, stiffness and mass as they stand in the formula."""
    return (
        f"L = {length_m:.3f} m, EI = {pipe.bending_n_m2 / 1e3:.4g} kN m^2, "
        f"m = {pipe.mass_kg_per_m:.4g} kg/m"
    )
