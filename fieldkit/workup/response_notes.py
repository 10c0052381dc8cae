"""What to know about a frequency response, in words with what to change."""

from __future__ import annotations

import math

from fieldkit.workup.response import ResponseReading

GOOD_COHERENCE = 0.9
"""Below it a mode of the response is doubtful (common practice, no source)."""
FULL_DECAY = 6.0
"""Time constants: a record as long keeps the error of magnitude and phase below 0.5 %
(Trethewey and Cafeo 1992, Tutorial: signal processing aspects of structural impact testing)."""
WORTH_SAYING = 0.005
_MUCH_HIGHER = 10.0


def response_notes(found: ResponseReading, up_to_hz: float) -> tuple[str, ...]:
    """All there is to say; empty for a response that leaves nothing open."""
    if found.refused:
        return (f"no frequency response: {found.refused}",)
    return (
        *found.notes,
        *on_reach(found, up_to_hz),
        *([found.not_fitted] if found.not_fitted else []),
        *on_coherence(found),
        *on_record(found),
        *on_masses(found),
    )


def on_reach(found: ResponseReading, up_to_hz: float) -> list[str]:
    """Does the force reach as far as the question, and not far beyond it?"""
    if found.force is None:
        return []
    usable_hz = found.usable_to_hz
    if usable_hz is not None and usable_hz < up_to_hz:
        return [
            f"the force has fallen by 20 dB at {usable_hz:.0f} Hz, short of the {up_to_hz:g} Hz "
            "looked at; use a harder tip to see higher"
        ]
    reach_hz = usable_hz or float(found.force.frequency_hz[-1])
    if reach_hz <= _MUCH_HIGHER * up_to_hz:
        return []
    return [
        f"the force reaches beyond {_MUCH_HIGHER:g} times the {up_to_hz:g} Hz looked at; a softer "
        "tip puts more of it where the modes are"
    ]


def on_coherence(found: ResponseReading) -> list[str]:
    """Which modes do the blows not agree about?"""
    low = [
        f"{mode.coherence:.2f} at {mode.frequency_hz:.4g} Hz"
        for mode in (found.fitted.modes if found.fitted else ())
        if mode.coherence is not None and mode.coherence < GOOD_COHERENCE
    ]
    if not low:
        return []
    return [
        f"coherence is only {', '.join(low)}: noise, or blows that differ in place or direction; "
        "strike the same spot, harder, or more often"
    ]


def on_record(found: ResponseReading) -> list[str]:
    """Was the decay recorded long enough?"""
    if found.fitted is None or found.response is None:
        return []
    mode = min(found.fitted.modes, key=lambda m: m.damping_ratio * m.frequency_hz)
    rate = 2 * math.pi * mode.damping_ratio * mode.frequency_hz
    shortest_s = min(found.response.rings_s)
    lost = math.exp(-rate * shortest_s)
    if lost < WORTH_SAYING:
        return []
    return [
        f"a blow was followed for {shortest_s:.1f} s, too short for {mode.frequency_hz:.4g} Hz: "
        f"the curve is up to {100 * lost:.2g} % too low there, the fitted one is not; let each "
        f"blow ring for {FULL_DECAY / rate:.1f} s"
    ]


def on_masses(found: ResponseReading) -> list[str]:
    """Can the effective masses be told, and believed?"""
    if found.fitted is None or found.response is None:
        return []
    if found.point == "unknown":
        return ["effective masses need the stations of sensor and hammer: write at for both"]
    if found.point == "transfer":
        return ["effective masses need a blow beside the sensor: this one was struck elsewhere"]
    if not found.response.calibrated:
        return ["effective masses need the sensitivity of both sensor and hammer"]
    out = []
    if found.wired_round:
        out.append(
            "sensor and hammer read against each other where they must agree: one of them is "
            "mounted or wired the other way round; the masses are told as if it were not"
        )
    unseen = [
        f"{mode.frequency_hz:.4g} Hz"
        for mode, mass in zip(found.fitted.modes, found.masses, strict=True)
        if mass is None
    ]
    if unseen:
        out.append(f"too little moves at this point to tell a mass: {', '.join(unseen)}")
    return out
