"""One recording of one kind and seed, worked through in both ways."""

from __future__ import annotations

from dataclasses import dataclass

from tests.bench.accuracy.bound import ModeBound, recording_bound
from tests.bench.accuracy.estimating import LOW_HZ, Estimated, automatic, with_taps_known
from tests.bench.accuracy.kinds import recording
from tests.bench.accuracy.peak_picking import Peak, pick
from tests.bench.accuracy.recordings import Simulated
from tests.bench.accuracy.scoring import Score, scored


@dataclass(frozen=True)
class Trial:
    """How one recording went, from the file alone and with the taps known."""

    kind: str
    seed: int
    automatic: Score
    known: Score


def run(kind: str, seed: int) -> Trial:
    """Simulate, estimate, compare."""
    made = recording(kind, seed)
    bounds = bounds_of(made)
    peaks = picked(made)
    return Trial(
        kind,
        seed,
        score(made, bounds, automatic(made), peaks),
        score(made, bounds, with_taps_known(made), peaks),
    )


def run_planned(planned: tuple[str, int]) -> Trial:
    """The same, for a pool of processes."""
    return run(*planned)


def bounds_of(made: Simulated) -> tuple[ModeBound, ...]:
    """One bound for every mode, none where no tap can be used."""
    return (
        recording_bound(made)
        if made.usable
        else tuple(ModeBound(1e9, 1e9, -99.0) for _ in made.modes)
    )


def picked(made: Simulated) -> tuple[Peak, ...]:
    """Peaks of the averaged spectrum of the true usable taps."""
    records = [made.samples[blow.start : blow.end] for blow in made.usable]
    if not records or not made.modes:
        return ()
    return pick(records, made.rate_hz, LOW_HZ, made.high_hz, len(made.modes))


def score(
    made: Simulated, bounds: tuple[ModeBound, ...], said: Estimated, peaks: tuple[Peak, ...]
) -> Score:
    return scored(made, bounds, said.estimate, said.taps, peaks, said.cpu_s)
