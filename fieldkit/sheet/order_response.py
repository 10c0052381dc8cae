"""Amplification of each order before and after a change, in words and as a document."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from fieldkit.detune.diagnosis import figure
from fieldkit.detune.order_response import Amplified, OrderResponse
from fieldkit.workup.chain import Workup
from fieldkit.workup.order_response import order_response

HOW = (
    "A single mode multiplies the deflection of a steady force by 1 / sqrt((1 - r^2)^2 + "
    "(2 zeta r)^2), r = forcing over natural frequency (Thomson, Theory of Vibration with "
    "Applications, from memory); taken at the worst speed of the range. It says how strongly the "
    "pipe answers, not how strong the force is."
)


def times_text(found: Amplified | None) -> str:
    """``19x (9.2–28)``."""
    if found is None:
        return "–"
    low, high = figure(found.low), figure(found.high)
    return f"{figure(found.times)}x" + (f" ({low}–{high})" if low != high else "")


def words(found: Sequence[OrderResponse]) -> str:
    """One sentence: every order with its amplification now and after."""
    told = [
        f"{one.band.name} {times_text(one.now)} → {times_text(one.after)}"
        for one in found
        if one.now is not None
    ]
    return f"Amplified at the worst speed: {'; '.join(told)}{_damping(found)}." if told else ""


def _damping(found: Sequence[OrderResponse]) -> str:
    known = [one.now.mode.damping_measured for one in found if one.now is not None]
    return ", damping as measured" if all(known) else ", damping assumed where none was measured"


def with_amplification(answer: Mapping[str, Any], work: Workup) -> dict[str, Any]:
    """The document of ``detune``, each fix with what it does to the answer to each order."""
    fixes = work.detuning.fixes if work.detuning else ()
    told = [
        {**entry, "amplification": document(order_response(work, fix))}
        for entry, fix in zip(answer["fixes"], fixes, strict=True)
    ]
    return {**answer, "fixes": told}


def document(found: Sequence[OrderResponse]) -> list[Mapping[str, Any]]:
    """One entry per order."""
    return [
        {"band": one.band.name, "now": _entry(one.now), "after": _entry(one.after)} for one in found
    ]


def _entry(found: Amplified | None) -> Mapping[str, Any] | None:
    if found is None:
        return None
    return {
        "amplification": found.times,
        "low": found.low,
        "high": found.high,
        "mode_hz": found.mode.hz,
        "damping_ratio": found.mode.damping.median,
        "damping_measured": found.mode.damping_measured,
    }
