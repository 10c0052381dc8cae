"""What a sheet shows beyond a workup: mesh check, weight, installations, frequency responses."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import TypeVar

from fieldkit.detune.install import Installation
from fieldkit.detune.verdict import Verdict
from fieldkit.errors import InputError, Refusal
from fieldkit.progress import Progress
from fieldkit.sheet.basis import Basis
from fieldkit.span.static import WeightAnswer
from fieldkit.workup import ResponseReading, Workup, at_rest, response_reading
from fieldkit.workup.convergence import Convergence, convergence
from fieldkit.workup.installing import installing

Found = TypeVar("Found")

DETAILED = 3
"""Changes told with their installation; the others stand in a table."""


def detailed(fixes: Sequence[Verdict]) -> list[Verdict]:
    """The first change, then the best of other kinds, then whatever comes next; in rank."""
    firsts = {fix.kind: fix for fix in reversed(fixes)}.values()
    others = sorted(firsts, key=lambda fix: fix.rank)
    chosen = [*others, *(fix for fix in fixes if fix not in others)][:DETAILED]
    return sorted(chosen, key=lambda fix: fix.rank)


@dataclass(frozen=True)
class Results:
    """Everything a sheet is written from."""

    work: Workup
    basis: Basis
    convergence: tuple[Convergence, ...] = ()
    weights: Mapping[str, WeightAnswer] = field(default_factory=dict)
    weight_notes: tuple[str, ...] = ()
    installs: Mapping[int, tuple[Installation, ...]] = field(default_factory=dict)
    responses: tuple[ResponseReading, ...] = ()
    refused: tuple[tuple[str, str], ...] = ()
    """Which of these could not be had, and why."""

    def why_not(self, part: str) -> list[str]:
        """Why a part is missing."""
        return [reason for name, reason in self.refused if name == part]


def results(work: Workup, basis: Basis, progress: Progress | None = None) -> Results:
    """Work out what else the sheet says; a part that cannot be had is missing with its reason."""
    tries = _Tries(progress or Progress(), [])
    fixes = detailed(work.detuning.fixes) if work.detuning else []
    mesh = tries.get("mesh", 0.0, lambda: convergence(work.job)) or ()
    weights, notes = tries.get("weight", 0.2, lambda: at_rest(work.job)) or ({}, ())
    installs = tries.get("installation", 0.3, lambda: installing(work, fixes)) or {}
    found = tries.get("response", 0.9, lambda: _responses(work)) or ()
    return Results(work, basis, mesh, weights, notes, installs, found, tuple(tries.refused))


@dataclass(frozen=True)
class _Tries:
    """Gets what can be had and keeps why the rest cannot."""

    progress: Progress
    refused: list[tuple[str, str]]

    def get(self, part: str, fraction: float, ask: Callable[[], Found]) -> Found | None:
        """The answer, if there is one."""
        self.progress.step(f"for the sheet: {part}", fraction)
        try:
            return ask()
        except (Refusal, InputError) as error:
            self.refused.append((part, str(error)))
            return None


def _responses(work: Workup) -> tuple[ResponseReading, ...]:
    up_to_hz = work.job.goal.up_to_hz
    found = [response_reading(reading, work.evidence, up_to_hz) for reading in work.taps]
    return tuple(one for one in found if one is not None)
