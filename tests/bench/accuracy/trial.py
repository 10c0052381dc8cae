"""One recording of one kind and seed, worked through."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

from tests.bench.accuracy.bound import ModeBound, recording_bound
from tests.bench.accuracy.estimating import LOW_HZ, Estimated, automatic, with_taps_known
from tests.bench.accuracy.kinds import recording
from tests.bench.accuracy.peak_picking import Peak, pick
from tests.bench.accuracy.recordings import Simulated
from tests.bench.accuracy.scoring import Score, scored

WAYS: Mapping[str, Callable[[Simulated], Estimated]] = {
    "samples alone": automatic,
    "taps known": with_taps_known,
}
"""How the modes are come by."""

_NOTHING_KNOWN = ModeBound(1e9, 1e9, -99.0)


@dataclass(frozen=True)
class Plan:
    """A recording to make, and how to work through it."""

    kind: str
    seed: int
    ways: tuple[str, ...] = tuple(WAYS)


@dataclass(frozen=True)
class Trial:
    """How one recording went, by way."""

    kind: str
    seed: int
    scores: Mapping[str, Score]


def run(plan: Plan) -> Trial:
    """Simulate, estimate, compare."""
    made = recording(plan.kind, plan.seed)
    bounds, peaks = bounds_of(made), picked(made)
    scores = {way: scored(made, bounds, WAYS[way](made), peaks) for way in plan.ways}
    return Trial(plan.kind, plan.seed, scores)


def bounds_of(made: Simulated) -> Sequence[ModeBound]:
    """One bound for every mode, as good as none where no tap can be used."""
    return recording_bound(made) if made.usable else [_NOTHING_KNOWN for _ in made.modes]


def picked(made: Simulated) -> tuple[Peak, ...]:
    """Peaks of the averaged spectrum of the true usable taps."""
    records = [made.samples[blow.start : blow.end] for blow in made.usable]
    if not records or not made.modes:
        return ()
    return pick(records, made.rate_hz, LOW_HZ, made.high_hz, len(made.modes))
