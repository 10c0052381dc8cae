"""Cures that live with the resonance, told as what they are."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from fieldkit.detune import judge
from fieldkit.detune.absorber import (
    ALLOWED_AMPLIFICATION,
    ASSUMED_DAMPING,
    AbsorberOffer,
    absorber_offer,
)
from fieldkit.detune.candidates import Search
from fieldkit.detune.matched import Match
from fieldkit.detune.verdict import OtherCure
from fieldkit.detune.wording import summary

ADDED_DAMPING = (0.03, 0.05, 0.1)
"""What viscous dampers, and layers on light lines, can reach (common practice, no source)."""
SHOWN_DAMPING = 0.05
LEAST_CHANCE = 0.5
"""An absorber that is likelier to fail, be it for another mode in a band, is not worth a word."""


def measured_damping(match: Match | None) -> float | None:
    """Median damping ratio of the tapped modes; None where none was measured."""
    found = [m.damping_ratio for m in match.measured if m.damping_ratio] if match else []
    return float(np.median(found)) if found else None


def other_cures(
    search: Search, spectrum: judge.Spectrum, match: Match | None, units: str
) -> tuple[OtherCure, ...]:
    """An absorber where the job allows one, and added damping; none where no mode is in a band."""
    zeta = measured_damping(match)
    offer = absorber_offer(search, spectrum, zeta)
    if offer is None:
        return ()
    worth_it = "absorber" in search.goal.allow and offer.chance >= LEAST_CHANCE
    absorber = [_absorber(offer, search, zeta, units)] if worth_it else []
    return (*absorber, _damping(offer, zeta))


def _absorber(offer: AbsorberOffer, search: Search, zeta: float | None, units: str) -> OtherCure:
    return OtherCure(
        kind="absorber",
        summary=summary(offer.change, search.span, units),
        chance=offer.chance,
        chance_means=(
            f"the mode at {offer.mode_hz:.1f} Hz multiplies less than {ALLOWED_AMPLIFICATION:g} "
            "times at every excitation and all other modes are clear"
        ),
        change=offer.change,
        direction=offer.change.direction,
        amplification_now=offer.amplification_now,
        amplification_after=offer.amplification,
        cautions=(
            f"it leaves about {offer.amplification:.1f} of {offer.amplification_now:.0f} times"
            f"{_assumed(zeta)}; the mode is not clear of the band",
            f"its mass is {100 * offer.mass_ratio:.0f} % of the {offer.modal_mass_kg:.3g} kg that "
            "the mode moves there; the damper is meant with the spring, not instead of it",
            f"its mass moves about {offer.stroke_ratio:.1f} times as far as the pipe: measure that "
            "running, leave room both ways, and choose spring and damper for the endless stroke",
            "tune it on the pipe: tap again, and move its frequency until both peaks are alike; "
            "tune again when contents or supports change",
            "a fatigue item with a safety chain of its own; to be confirmed by the responsible "
            "piping engineer under the local code",
        ),
    )


def _damping(offer: AbsorberOffer, zeta: float | None) -> OtherCure:
    now = ASSUMED_DAMPING if zeta is None else zeta
    worth = [added for added in ADDED_DAMPING if added > now]
    after = max(SHOWN_DAMPING, now)
    return OtherCure(
        kind="damping",
        summary=f"add damping to the {offer.change.direction} mode at {offer.mode_hz:.1f} Hz: "
        f"in resonance {100 * now:.2g} % multiplies {1 / (2 * now):.0f} times{_assumed(zeta)}, "
        + _left(worth),
        chance=None,
        chance_means="nothing is promised: the mode stays in the band, 1 / (2 zeta) is what is "
        "left in resonance",
        direction=offer.change.direction,
        amplification_now=1 / (2 * now),
        amplification_after=1 / (2 * after),
        cautions=(
            "never clear of the band: a lesser cure, worth it where the vibration is some times "
            "too large, not where it is many times too large",
        ),
    )


def _left(damping: Sequence[float]) -> str:
    return ", ".join(f"{100 * z:g} % {1 / (2 * z):.0f} times" for z in damping)


def _assumed(zeta: float | None) -> str:
    return " (damping assumed, none was measured)" if zeta is None else ""
