"""Suggested support spacing of standard-wall steel pipe, straight and level.

These are sag rules (1500 psi of bending and shear, water filled, 0.1 in of sag), not vibration
rules: spans so spaced have their first mode at 10 to 17 Hz between pinned supports.
"""

from __future__ import annotations

from dataclasses import dataclass

FOOT_M = 0.3048
SOURCE = (
    "support spacing after ASME B31.1 and MSS SP-69, as quoted in a piping handbook (table B5.1) "
    "and, for sizes between, in an open table adapted from SP-69"
)


@dataclass(frozen=True)
class SuggestedSpacing:
    """Distance between weight supports."""

    size: str
    water_m: float
    """Liquid-filled line."""
    gas_m: float
    """Steam, gas or air line."""
    source: str = SOURCE


_TABLE = (
    # NPS, outside diameter in m (ASME B36.10M), water ft, gas ft
    ("1/2", 0.0213, 7, 8),
    ("3/4", 0.0267, 7, 9),
    ("1", 0.0334, 7, 9),
    ("1-1/2", 0.0483, 9, 12),
    ("2", 0.0603, 10, 13),
    ("2-1/2", 0.0730, 11, 14),
    ("3", 0.0889, 12, 15),
    ("4", 0.1143, 14, 17),
    ("6", 0.1683, 17, 21),
    ("8", 0.2191, 19, 24),
    ("10", 0.2730, 20, 26),
    ("12", 0.3238, 23, 30),
    ("14", 0.3556, 25, 32),
    ("16", 0.4064, 27, 35),
    ("18", 0.4570, 28, 37),
    ("20", 0.5080, 30, 39),
    ("24", 0.6100, 32, 42),
)
_SAME_DIAMETER = 0.02


def suggested_spacing_m(size: str) -> SuggestedSpacing | None:
    """Spacing of a nominal size, ``NPS 4`` or ``1-1/2``; None where the table has no such size."""
    wanted = size.upper().removeprefix("NPS").strip().replace(" ", "-")
    return next((_entry(*row) for row in _TABLE if row[0] == wanted), None)


def spacing_by_diameter(outside_diameter_m: float) -> SuggestedSpacing | None:
    """Spacing of the nominal size whose outside diameter is within 2 %; None where none is."""
    for row in _TABLE:
        if abs(row[1] / outside_diameter_m - 1) < _SAME_DIAMETER:
            return _entry(*row)
    return None


def _entry(size: str, _diameter_m: float, water_ft: int, gas_ft: int) -> SuggestedSpacing:
    return SuggestedSpacing(f"NPS {size}", water_ft * FOOT_M, gas_ft * FOOT_M)
