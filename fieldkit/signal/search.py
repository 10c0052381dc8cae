"""Find damped exponentials in free decays: add one, refit its neighbours, keep it if it pays."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from fieldkit.signal.clusters import fit_together, needed_gain, overlapping, span_s
from fieldkit.signal.decimation import decimate
from fieldkit.signal.scan import Candidate, Region, scan, threshold
from fieldkit.signal.traces import Component, Trace, component, residual

_MOST_ROUNDS = 14
_MOST_PARTS = 60
_NO_DECAY = 0.12
"""Decays over the whole record below which a line is taken as steady."""


@dataclass(frozen=True)
class Found:
    """The components of a search, and places that were tried in vain."""

    parts: tuple[Component, ...]
    vain: tuple[complex, ...] = ()


def search(traces: Sequence[Trace], tones: Sequence[Component], region: Region) -> Found:
    """Add components until nothing significant is left."""
    found = Found(tuple(tones))
    for _ in range(_MOST_ROUNDS):
        coarse = leftovers(traces, found.parts, region)
        fresh = [c for c in scan(coarse, region) if not tried(c, found.vain, traces)]
        if not fresh or len(found.parts) > _MOST_PARTS:
            break
        for candidate in fresh:
            found = add(traces, found, candidate, region)
    return found


def leftovers(traces: Sequence[Trace], parts: Sequence[Component], region: Region) -> list[Trace]:
    """What the components leave, at a rate just high enough for the region."""
    out = []
    for tap, trace in enumerate(traces):
        left, rate_hz = decimate(
            residual(trace, tap, parts),
            trace.rate_hz,
            keep_hz=region.high_hz,
            wanted_rate_hz=3 * region.high_hz,
        )
        out.append(Trace(left, rate_hz, trace.noise))
    return out


def tried(candidate: Candidate, vain: Sequence[complex], traces: Sequence[Trace]) -> bool:
    """True where an earlier candidate of about this pole was turned down."""
    spacing = 2 * np.pi / max(t.duration_s for t in traces)
    return any(
        abs(candidate.pole.imag - v.imag) < max(-candidate.pole.real, -v.real, spacing)
        for v in vain
    )


def add(traces: Sequence[Trace], found: Found, candidate: Candidate, region: Region) -> Found:
    """The search with the candidate taken in, or noted as vain."""
    new = component(candidate.pole, len(traces))
    duration_s = span_s([new], traces)
    near = overlapping(new, found.parts, duration_s)
    rest = without(found.parts, near)
    around = [*near, new]
    before = fit_together(traces, near, rest, region.high_hz, over=around)
    after = fit_together(traces, [*before.active, new], rest, region.high_hz, over=around)
    needed = needed_gain(before.freedom, len(traces), threshold(len(traces), 100))
    if before.cost - after.cost < needed * max(after.variance, 1.0):
        return replace(found, vain=(*found.vain, candidate.pole))
    settled = [still(p, traces) for p in after.active]
    return replace(found, parts=(*updated(rest, after.passive), *settled))


def still(part: Component, traces: Sequence[Trace]) -> Component:
    """A component that does not decay over the record becomes a steady tone."""
    longest = max(t.duration_s for t in traces)
    if part.decay_per_s * longest > _NO_DECAY:
        return part
    return replace(part.with_pole(1j * part.pole.imag), steady=True)


def without(parts: Sequence[Component], gone: Sequence[Component]) -> list[Component]:
    """Parts less some of them, by identity."""
    names = {id(g) for g in gone}
    return [p for p in parts if id(p) not in names]


def updated(parts: Sequence[Component], fresh: Sequence[Component]) -> list[Component]:
    """Parts with the amplitudes of the fresh ones that have the same pole."""
    by_pole = {(p.pole, p.steady): p for p in fresh}
    return [by_pole.get((p.pole, p.steady), p) for p in parts]


def pruned(traces: Sequence[Trace], found: Found, region: Region) -> Found:
    """Backward elimination: drop, weakest first, what the others can explain after a refit."""
    parts = list(found.parts)
    for part in sorted((p for p in parts if not p.steady), key=peak_amplitude):
        current = next((p for p in parts if p.pole == part.pole and not p.steady), None)
        if current is None:
            continue
        near = overlapping(current, parts, span_s([current], traces))
        rest = without(parts, [*near, current])
        around = [*near, current]
        with_it = fit_together(traces, around, rest, region.high_hz, over=around)
        alone = fit_together(traces, near, rest, region.high_hz, over=around)
        needed = needed_gain(alone.freedom, len(traces), threshold(len(traces), 100))
        keep = alone.cost - with_it.cost >= needed * max(with_it.variance, 1.0)
        chosen = with_it if keep else alone
        parts = [*updated(rest, chosen.passive), *chosen.active]
    return replace(found, parts=tuple(parts))


def peak_amplitude(part: Component) -> float:
    """Largest amplitude over the taps."""
    return float(np.abs(part.amplitudes).max())
