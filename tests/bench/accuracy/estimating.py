"""The estimator on a simulated recording: from the samples alone, and with the taps known."""

from __future__ import annotations

import time
import traceback
from collections.abc import Callable
from dataclasses import dataclass, replace
from pathlib import Path

from fieldkit.errors import Refusal
from fieldkit.signal.modes import ModeEstimate, TapRecord, estimate_modes
from fieldkit.signal.taps import Tap, cut, find_taps
from tests.bench.accuracy.recordings import FULL_SCALE, Simulated

LOW_HZ = 2.0
NOTHING = ModeEstimate((), ())


@dataclass(frozen=True)
class Estimated:
    """What was said about one recording."""

    estimate: ModeEstimate
    taps: tuple[Tap, ...] | None
    """None where they were known before."""
    cpu_s: float
    crash: str = ""
    """What broke, if anything did: nothing is estimated then."""


def automatic(made: Simulated) -> Estimated:
    """As a file is read: taps found, cut and estimated."""

    def read() -> tuple[ModeEstimate, tuple[Tap, ...]]:
        search = find_taps(made.samples, made.rate_hz, full_scale=FULL_SCALE)
        records = cut(made.samples, made.rate_hz, search)
        estimate = modes_of(records, made.high_hz)
        return estimate, with_said(search.taps, estimate.struck_twice)

    return watched(read)


def with_said(taps: tuple[Tap, ...], struck_twice: tuple[int, ...]) -> tuple[Tap, ...]:
    """The taps, those that the estimate says are struck twice with that as a reason."""
    usable = [i for i, tap in enumerate(taps) if tap.usable]
    twice = {usable[k] for k in struck_twice}
    reason = ("struck twice, as the modes show",)
    return tuple(
        replace(tap, usable=False, reasons=reason) if i in twice else tap
        for i, tap in enumerate(taps)
    )


def with_taps_known(made: Simulated) -> Estimated:
    """The true usable taps, cut at the true end of contact and the true next blow."""
    background = made.samples[slice(*made.background)]
    records = tuple(
        TapRecord(made.samples[blow.start : blow.end], made.rate_hz, background)
        for blow in made.usable
    )
    return watched(lambda: (modes_of(records, made.high_hz), None))


def modes_of(records: tuple[TapRecord, ...], high_hz: float) -> ModeEstimate:
    """Nothing where the estimator refuses to answer."""
    if not records:
        return NOTHING
    try:
        return estimate_modes(records, low_hz=LOW_HZ, high_hz=high_hz)
    except Refusal:
        return NOTHING


def watched(way: Callable[[], tuple[ModeEstimate, tuple[Tap, ...] | None]]) -> Estimated:
    """Processor time of a way; one that breaks has found nothing, and the bench goes on."""
    start = time.process_time()
    try:
        estimate, taps = way()
    except Exception as broken:
        frame = traceback.extract_tb(broken.__traceback__)[-1]
        where = f"{Path(frame.filename).name}:{frame.lineno}"
        crash = f"{type(broken).__name__} in {where}: {broken}"
        return Estimated(NOTHING, None, time.process_time() - start, crash)
    return Estimated(estimate, taps, time.process_time() - start)
