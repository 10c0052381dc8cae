"""The published rule behind the tables of support spacing, as limits for a line at rest."""

from __future__ import annotations

from dataclasses import dataclass

from fieldkit.span.spacing import SOURCE, SuggestedSpacing, spacing_by_diameter
from fieldkit.span.static import WeightAnswer

SAG_LIMIT_M = 0.1 * 0.0254
STRESS_LIMIT_PA = 1500 * 6894.757
"""Combined bending and shear of a water-filled line; the shear is left out here, being small."""
RULE = "1500 psi (10.3 MPa) of bending under weight and 0.1 in (2.5 mm) of sag"


@dataclass(frozen=True)
class RuleReading:
    """A line at rest beside the rule."""

    sag_kept: bool
    stress_kept: bool
    suggested: SuggestedSpacing | None
    """Spacing of this size in the table; None where it is not a size of it."""
    rule: str = RULE
    source: str = SOURCE

    @property
    def kept(self) -> bool:
        """Whether both limits are."""
        return self.sag_kept and self.stress_kept


def against_rule(answer: WeightAnswer, outside_diameter_m: float) -> RuleReading:
    """Whether sag and bending stress keep to the rule."""
    return RuleReading(
        answer.sag_m <= SAG_LIMIT_M,
        answer.bending_stress_pa <= STRESS_LIMIT_PA,
        spacing_by_diameter(outside_diameter_m),
    )
