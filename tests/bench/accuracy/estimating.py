"""The estimator on a simulated recording: from the samples alone, and with the taps known."""

from __future__ import annotations

import time
from dataclasses import dataclass

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


def automatic(made: Simulated) -> Estimated:
    """As a file is read: taps found, cut and estimated."""
    start = time.process_time()
    search = find_taps(made.samples, made.rate_hz, full_scale=FULL_SCALE)
    records = cut(made.samples, made.rate_hz, search)
    estimate = modes_of(records, made.high_hz)
    return Estimated(estimate, search.taps, time.process_time() - start)


def with_taps_known(made: Simulated) -> Estimated:
    """The true usable taps, cut at the true end of contact and the true next blow."""
    background = made.samples[slice(*made.background)]
    records = tuple(
        TapRecord(made.samples[blow.start : blow.end], made.rate_hz, background)
        for blow in made.usable
    )
    start = time.process_time()
    estimate = modes_of(records, made.high_hz)
    return Estimated(estimate, None, time.process_time() - start)


def modes_of(records: tuple[TapRecord, ...], high_hz: float) -> ModeEstimate:
    """Nothing where the estimator refuses to answer."""
    if not records:
        return NOTHING
    try:
        return estimate_modes(records, low_hz=LOW_HZ, high_hz=high_hz)
    except Refusal:
        return NOTHING
