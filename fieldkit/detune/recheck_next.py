"""What comes after a recheck: the measurement that would settle it, or the next change."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fieldkit.detune.excitation import Excitation, Goal
from fieldkit.detune.fixes import AllOf, StiffenSupport
from fieldkit.detune.matched import Match
from fieldkit.detune.rank import afresh, detune, judged_change, prepare
from fieldkit.detune.recheck_answer import AsFound
from fieldkit.detune.recheck_spans import STIFFNESS, Installed
from fieldkit.detune.recheck_verdict import Judged, Now
from fieldkit.detune.verdict import Detuning, Verdict
from fieldkit.progress import Progress
from fieldkit.span.layout import Span, State

STIFFENED = ("vertical", "lateral", "rotation")


def measure_next(now: Now, found: Judged, goal: Goal) -> str:
    """What to tap so that the question can be answered."""
    unseen = [m for m in found.modes if m.measured_hz is None and m.chance_clear < goal.chance]
    if now.stray and found.stray_in_band:
        peaks = ", ".join(f"{mode.frequency_hz:.1f} Hz" for mode in now.stray)
        return (
            f"move the sensor along the pipe and tap again: whether {peaks} grows and shrinks "
            "along it tells if it is this pipe"
        )
    if unseen:
        worst = min(unseen, key=lambda mode: mode.chance_clear)
        return (
            f"tap in {worst.direction} direction, with the sensor beside the blow, away from the "
            f"supports: the mode expected near {_as_tapped(now, worst.median_hz):.0f} Hz was not "
            "seen"
        )
    if not now.same_state:
        return (
            "tap the pipe as it runs, full and warm, with the machine stopped: the frequency then "
            "counts as it is"
        )
    return "tap again, five blows or more in each direction, the sensor where the mode moves most"


def _as_tapped(now: Now, running_hz: float) -> float:
    """About where a mode that runs there is found in the state of the re-tap."""
    medians = np.median(now.running.frequency_hz, axis=0)
    label = int(np.argmin(np.abs(medians - running_hz)))
    return float(np.median(now.tapped.frequency_hz[:, label]))


@dataclass(frozen=True)
class Standing:
    """The pipe as it is found, to look for the next change on."""

    span: Span
    tapped: State
    running: State
    match: Match
    excitations: tuple[Excitation, ...]
    goal: Goal


def offers(there: Standing, units: str, progress: Progress) -> Detuning:
    """Ranked changes on top of the one that is in place."""
    return detune(
        there.span,
        there.tapped,
        there.running,
        there.match,
        there.excitations,
        there.goal,
        units,
        progress,
    )


def mended(
    there: Standing, found: Installed, brought: Sequence[AsFound], units: str
) -> Verdict | None:
    """The supports of the change brought to the stiffness drawn; None where they have it."""
    if found.name != STIFFNESS or all(one.median >= one.drawn for one in brought if one.drawn):
        return None
    drawn: dict[int, dict[str, float]] = {}
    for (support, axis), value in found.own_springs.items():
        if axis in STIFFENED:
            drawn.setdefault(support, {})[axis] = value
    changes = [
        StiffenSupport(index, a.get("vertical"), a.get("lateral"), a.get("rotation"))
        for index, a in drawn.items()
    ]
    if not changes:
        return None
    change = changes[0] if len(changes) == 1 else AllOf(tuple(changes))
    search, _ = prepare(
        there.span, there.tapped, there.running, there.match, there.excitations, there.goal
    )
    search = afresh(search, there.match)
    return judged_change(search, there.tapped, there.running, change, units)
