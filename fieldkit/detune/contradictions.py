"""What a measurement says against the model: peaks nothing explains, modes that did not show."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fieldkit.detune.evidence import RUNNING
from fieldkit.detune.excitation import Excitation, bands, excitation_band
from fieldkit.detune.matched import Pair
from fieldkit.detune.visible import Followed
from fieldkit.signal.modes import MeasuredMode
from fieldkit.span.layout import Span, State

STRONG = 0.1
"""A peak at least this share of the strongest one must be explained."""
CERTAIN_TO_SHOW = 0.9
MERGED = 0.03
"""A mode this near to a measured peak, relative, may hide under it."""
WALL_REACH = 0.5
"""A peak below this share of the lowest wall mode is none."""
SPLIT = 0.08
"""Two peaks of one direction this near to each other may be one mode that switches."""
HEAVY_DAMPING = 0.06


@dataclass(frozen=True)
class Contradiction:
    """One thing the model does not account for."""

    kind: str
    """``peak`` (measured, in no model) or ``mode`` (in the model, not measured)."""
    frequency_hz: float
    direction: str | None
    text: str
    """One sentence: what was found and what it may be."""
    check: str
    """What tells which."""


def unexplained(
    unpaired: Sequence[MeasuredMode],
    pairs: Sequence[Pair],
    span: Span,
    tapped: State,
    excitations: Sequence[Excitation],
) -> tuple[Contradiction, ...]:
    """Strong tapped or typed peaks that belong to no computed mode, strongest first."""
    strong = [m for m in unpaired if m.source != RUNNING and m.strength >= STRONG]
    strong.sort(key=lambda mode: -mode.strength)
    return tuple(_peak(mode, pairs, span, tapped, excitations) for mode in strong)


def _peak(
    mode: MeasuredMode,
    pairs: Sequence[Pair],
    span: Span,
    tapped: State,
    excitations: Sequence[Excitation],
) -> Contradiction:
    causes = _causes(mode, pairs, span, tapped, excitations)
    what = "; or ".join(cause for cause, _ in causes)
    return Contradiction(
        "peak",
        mode.frequency_hz,
        mode.direction,
        f"the peak at {mode.frequency_hz:.2f} Hz ({100 * mode.strength:.0f} % as strong as the "
        f"strongest) belongs to no computed mode: {what}",
        "; ".join(check for _, check in causes),
    )


def _causes(
    mode: MeasuredMode,
    pairs: Sequence[Pair],
    span: Span,
    tapped: State,
    excitations: Sequence[Excitation],
) -> list[tuple[str, str]]:
    """(what it may be, what to check), the likeliest first (common practice, no source)."""
    found = []
    order = excitation_band(mode.frequency_hz, bands(excitations, 0.0))
    if order is not None:
        found.append(
            (
                f"it sits on {order.name}, so the machine may have been turning",
                "tap with the machine stopped",
            )
        )
    twin = next((pair for pair in pairs if _twins(mode, pair.measured)), None)
    if twin is not None:
        found.append(
            (
                f"beside {twin.measured.frequency_hz:.2f} Hz of the same direction it looks like a "
                "support with play that is now in touch, now not",
                "push the pipe at each support by hand, and compare soft with harder blows",
            )
        )
    if (mode.damping_ratio or 0.0) > HEAVY_DAMPING:
        found.append(
            (
                "its heavy damping points to the structure or the foundation under a support",
                "strike the steel and the frame instead, with the sensor left on the pipe",
            )
        )
    found.append(
        (
            "a line joined to this one, or a part hung on it, may ring there",
            "move the sensor along the pipe and onto the neighbours: where the peak is largest, "
            "there it lives",
        )
    )
    if mode.frequency_hz > WALL_REACH * ovalling_hz(span, tapped):
        found.append(
            (
                "the pipe wall itself may oval",
                "compare two sensors on one circumference, 90 degrees apart",
            )
        )
    elif tapped.fill[1] > 0 and span.contents_density_kg_per_m3 > 0:
        found.append(
            (
                "the contents may resonate between two ends of the line",
                "tap again drained: a peak that stays is no acoustic one",
            )
        )
    return found


def _twins(a: MeasuredMode, b: MeasuredMode) -> bool:
    return a.direction == b.direction and abs(a.frequency_hz / b.frequency_hz - 1) <= SPLIT


def ovalling_hz(span: Span, state: State) -> float:
    """Lowest mode of a thin ring, two waves round it: no wall mode of the pipe lies far below.

    omega^2 = n^2 (n^2 - 1)^2 / (n^2 + 1) E I / (rho A R^4), n = 2, plate stiffness for E (Love's
    ring formula; Blevins 1979, Formulas for Natural Frequency and Mode Shape, from memory).
    """
    pipe, material = span.pipe, span.material
    plate = material.modulus_at(state.temperature_k) / (1 - material.poisson**2)
    carried = state.nominal_fill * span.contents_density_kg_per_m3 * pipe.mean_radius_m / 2
    per_area = material.density_kg_per_m3 * pipe.wall_m + carried
    bending = plate * pipe.wall_m**3 / 12
    return math.sqrt(36 / 5 * bending / (per_area * pipe.mean_radius_m**4)) / (2 * math.pi)


def not_seen(
    watched: Followed,
    state: str,
    measured: Sequence[MeasuredMode],
    pairs: Sequence[Pair],
) -> tuple[Contradiction, ...]:
    """Modes of a state that the taps should have shown at the places they were struck."""
    tapped = [m for m in measured if m.taps and m.state == state and m.source != RUNNING]
    places = {(m.direction, m.at_m) for m in tapped if m.direction and m.at_m is not None}
    paired = {pair.mode for pair in pairs if pair.measured.state == state}
    missed = np.ones(len(watched.number))
    for direction, at_m in sorted(places):
        station = int(np.argmin(np.abs(watched.field.station_m - at_m)))
        missed = missed * (1 - watched.shown([station], direction)[0])
    peaks = [m.frequency_hz for m in measured if m.state == state]
    return tuple(
        _mode(watched, j, float(1 - missed[j]))
        for j, number in enumerate(watched.number)
        if number not in paired
        and 1 - missed[j] >= CERTAIN_TO_SHOW
        and not _hidden(watched, j, peaks)
    )


def _hidden(watched: Followed, j: int, peaks_hz: Sequence[float]) -> bool:
    """Whether a mode may lie under a measured peak for some member."""
    low, high = watched.interval(j)
    return any(low * (1 - MERGED) <= peak <= high * (1 + MERGED) for peak in peaks_hz)


def _mode(watched: Followed, j: int, chance: float) -> Contradiction:
    low, high = watched.interval(j)
    direction = watched.direction[j]
    return Contradiction(
        "mode",
        float(np.median(watched.frequency_hz[:, j])),
        direction,
        f"the {direction} mode expected between {low:.1f} and {high:.1f} Hz should have shown in "
        f"these taps ({100 * min(chance, 0.99):.0f} %) and did not: a support may hold where the "
        "model lets go, or the mode dies out too fast to be seen",
        f"strike in {direction} direction where it moves most, harder and softer; look whether "
        "something touches or damps the pipe there",
    )
