"""How many more blows are worth it, and where to go when this place has told what it can."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.modes import MeasuredMode

LEAST_BLOWS = 3
MOST_BLOWS = 5
"""Three to five good blows (common practice, no source)."""
MATTERS = 2e-3
"""Relative standard deviation of a frequency below which more blows change no decision: a quarter
of what the length of a pipe alone leaves open."""
FAINT = 0.02
"""Share of the strongest mode's energy below which a mode may have a node nearby."""
_SAME_SDS = 4.0
_STILL = 0.35
"""Of a mode's largest motion: what is below is hardly seen."""


@dataclass(frozen=True)
class Worth:
    """What more blows would bring here."""

    more: int
    """Blows still worth it; 0: this place has told what it can."""
    why: str
    worst_sd: float | None
    """Largest relative standard deviation of a frequency so far."""
    expected_sd: float | None
    """The same with one more blow."""


@dataclass(frozen=True)
class Expected:
    """A mode of the span's model, which tells where it moves."""

    frequency_hz: float
    station_m: NDArray[np.float64]
    """(N,)"""
    motion: NDArray[np.float64]
    """(N,) absolute, in the direction of the sensor, largest 1."""


def worth(modes: Sequence[MeasuredMode], good: int) -> Worth:
    """How many more blows are worth it after so many good ones that gave these modes."""
    worst = max((m.frequency_sd_hz / m.frequency_hz for m in modes), default=None)
    expected = None if worst is None else with_more(worst, good, 1)
    if good < LEAST_BLOWS:
        more = LEAST_BLOWS - good
        return Worth(more, "three blows must agree before they are believed", worst, expected)
    if worst is None:
        more = 1 if good < MOST_BLOWS else 0
        return Worth(more, "no mode stands out: strike harder, or elsewhere", None, None)
    if good >= MOST_BLOWS:
        return Worth(0, _after_most(worst), worst, expected)
    lonely = [m for m in modes if m.taps == 1]
    if lonely:
        why = f"the mode at {lonely[0].frequency_hz:.1f} Hz was seen in one blow only"
        return Worth(1, why, worst, expected)
    if worst <= MATTERS:
        why = f"{good} blows agree: every frequency is known to {100 * worst:.2f} %"
        return Worth(0, why, worst, expected)
    wanted = math.ceil(good * ((worst / MATTERS) ** 2 - 1))
    more = min(max(wanted, 1), MOST_BLOWS - good)
    why = f"the least sure frequency is known to {100 * worst:.1f} %"
    return Worth(more, why, worst, expected)


def best_here(
    modes: Sequence[MeasuredMode], others: Sequence[Sequence[MeasuredMode]]
) -> tuple[MeasuredMode, ...]:
    """Modes of one sensor without those that another sensor beside it knows better."""
    known = [mode for other in others for mode in other]
    return tuple(mode for mode in modes if not any(_better(other, mode) for other in known))


def _better(one: MeasuredMode, than: MeasuredMode) -> bool:
    """Whether a mode seen in another direction is the same one, and known better."""
    apart_hz = abs(one.frequency_hz - than.frequency_hz)
    doubt_hz = float(np.hypot(one.frequency_sd_hz, than.frequency_sd_hz))
    same = apart_hz <= max(_SAME_SDS * doubt_hz, MATTERS * than.frequency_hz)
    return same and one.frequency_sd_hz < than.frequency_sd_hz


def with_more(sd: float, good: int, more: int) -> float:
    """Standard deviation expected after more blows like those so far."""
    return sd * math.sqrt(good / (good + more))


def _after_most(worst: float) -> str:
    if worst <= MATTERS:
        return f"enough: every frequency is known to {100 * worst:.2f} %"
    return (
        f"the blows still differ ({100 * worst:.1f} %), and more of them would not help: look for "
        "play in a support, strike softer, or elsewhere"
    )


def next_place(
    modes: Sequence[MeasuredMode],
    good: int,
    at_m: float | None,
    expected: Sequence[Expected] = (),
    up_to_hz: float = 200.0,
) -> str:
    """Where a mode may have been missed at this place, in words; empty where there is no sign."""
    still = [e for e in expected if at_m is not None and _motion(e, at_m) < _STILL]
    still = [e for e in still if e.frequency_hz <= up_to_hz]
    if still and at_m is not None:
        return (
            f"the mode computed at {still[0].frequency_hz:.1f} Hz hardly moves at {at_m:.2f} m: "
            f"sensor and hammer to about {best_station(expected, up_to_hz):.2f} m"
        )
    faint = [m for m in modes if m.strength < FAINT or 2 * m.taps < good]
    if faint:
        return (
            f"the mode at {faint[0].frequency_hz:.1f} Hz is faint here and may have a node nearby: "
            "move the sensor by a quarter of the span, and strike beside it"
        )
    return ""


def best_station(expected: Sequence[Expected], up_to_hz: float) -> float:
    """Station at which the mode that moves least there moves most."""
    inside = [e for e in expected if e.frequency_hz <= up_to_hz] or list(expected)
    station_m = inside[0].station_m
    least = np.min([np.interp(station_m, e.station_m, e.motion) for e in inside], axis=0)
    return float(station_m[int(np.argmax(least))])


def _motion(mode: Expected, at_m: float) -> float:
    return float(np.interp(at_m, mode.station_m, mode.motion))
