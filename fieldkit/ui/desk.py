"""Everything the views show at one moment, and how far each step of the work has come."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from enum import Enum
from typing import TYPE_CHECKING

from fieldkit.detune.excitation import Band, bands

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from fieldkit.detune.verdict import JudgedMode, Verdict
    from fieldkit.job.document import Job, RecordingEntry
    from fieldkit.job.store import JobText
    from fieldkit.span.modes import Mode
    from fieldkit.workup import StateModes, Workup

STEPS = ("tap", "running", "span", "match", "detune", "sheet")
"""The views in the order of the work."""


Spread = tuple[float, float, float]
"""A frequency with its doubt: 5 %, median, 95 %."""


class StepState(Enum):
    """How far a step has come; told by a glyph and a word, never by colour alone."""

    TO_DO = ("·", "to do")
    WORKING = ("▸", "working")
    STOPPED = ("■", "stopped")
    DONE = ("✓", "done")
    REFUSED = ("✗", "refused")

    @property
    def glyph(self) -> str:
        """One cell."""
        return self.value[0]

    @property
    def word(self) -> str:
        """One or two words."""
        return self.value[1]


@dataclass(frozen=True)
class Desk:
    """What lies on the desk; views read it and change nothing."""

    job: Job | None = None
    text: JobText | None = None
    """What the job was read from: the values as they were typed."""
    workup: Workup | None = None
    states: tuple[StateModes, ...] = ()
    """Computed modes per state, unknowns at their prior medians."""
    span_refused: str = ""
    """Why there are none."""
    chosen: Verdict | None = None
    chosen_modes: tuple[Mode, ...] = ()
    """Mode shapes with the chosen fix, running state."""
    traces: Mapping[RecordingEntry, NDArray[np.float64]] = field(default_factory=dict)
    """Samples of the recordings looked at so far."""
    working: bool = False
    fresh: tuple[str, ...] = ()
    """Steps whose results came in while the work goes on."""
    stopped: bool = False
    failed: str = ""
    """Why the whole chain could not be finished."""

    @property
    def units(self) -> str:
        """``SI`` or ``US``."""
        return self.job.units if self.job else "SI"

    @property
    def bands(self) -> tuple[Band, ...]:
        """The forbidden bands of the job."""
        if self.job is None:
            return ()
        return bands(self.job.excitations, self.job.goal.margin)

    @property
    def up_to_hz(self) -> float:
        """Upper end of everything that has a frequency axis."""
        return self.job.goal.up_to_hz if self.job else 200.0

    @property
    def measured_hz(self) -> tuple[float, ...]:
        """Natural frequencies that were measured."""
        return (
            tuple(mode.frequency_hz for mode in self.workup.evidence.modes) if self.workup else ()
        )

    @property
    def now(self) -> tuple[Spread, ...]:
        """Natural frequencies in the running state as the span is now: low, median, high."""
        if self.workup and self.workup.detuning:
            return spreads(self.workup.detuning.modes)
        running = self.modes_of("running")
        return tuple((mode.frequency_hz,) * 3 for mode in running)

    @property
    def after(self) -> tuple[Spread, ...]:
        """The same with the chosen fix."""
        return spreads(self.chosen.modes_after) if self.chosen else ()

    @property
    def simulated(self) -> tuple[str, ...]:
        """Recordings of the job that the practice rig made."""
        return self.workup.simulated if self.workup else ()

    @property
    def mode_hz(self) -> tuple[float, ...]:
        """Natural frequencies as they are now, running state where that is known."""
        return tuple(median for _, median, _ in self.now) or self.measured_hz

    def modes_of(self, state: str) -> tuple[Mode, ...]:
        """Computed modes of ``tapped`` or ``running``; empty where there are none yet."""
        for entry in self.states:
            if entry.state == state:
                return entry.modes
        return ()

    def awaits(self, step: str) -> bool:
        """Whether the work going on has still to come to a step."""
        return self.working and step not in self.fresh

    def refusals(self, step: str) -> tuple[str, ...]:
        """Why a step has no answer; empty when it has one or was not asked."""
        return self.workup.refusals(step) if self.workup else ()

    def has(self, kind: str) -> bool:
        """Whether the job names recordings of this kind, or typed measurements for ``tap``."""
        if self.job is None:
            return False
        return bool(self.job.recordings_of(kind)) or (kind == "tap" and bool(self.job.measured))


def spreads(modes: Iterable[JudgedMode]) -> tuple[Spread, ...]:
    """Frequencies of judged modes with their doubt."""
    return tuple((mode.low_hz, mode.median_hz, mode.high_hz) for mode in modes)


def step_states(desk: Desk) -> dict[str, StepState]:
    """How far each step has come, by its name in STEPS."""
    return {step: _state_of(step, desk) for step in STEPS}


def _state_of(step: str, desk: Desk) -> StepState:
    if desk.job is None or (step in ("tap", "running") and not desk.has(step)):
        return StepState.TO_DO
    if step == "span" and (desk.states or desk.span_refused):
        return StepState.REFUSED if desk.span_refused else StepState.DONE
    if desk.awaits(step):
        return StepState.WORKING
    if _answered(step, desk):
        return StepState.DONE
    if desk.stopped:
        return StepState.STOPPED
    if step == "match" and not desk.has("tap"):
        return StepState.TO_DO
    return StepState.REFUSED if desk.workup or desk.failed else StepState.TO_DO


def _answered(step: str, desk: Desk) -> bool:
    if desk.workup is None:
        return False
    done = {
        "tap": bool(desk.workup.evidence.firm),
        "running": bool(desk.workup.running),
        "match": desk.workup.match is not None,
        "detune": desk.workup.detuning is not None,
        "sheet": True,
    }
    return done.get(step, False)
