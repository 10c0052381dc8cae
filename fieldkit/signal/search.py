"""Find damped exponentials in free decays: add one, refit its neighbours, keep it if it pays."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from fieldkit.signal.clusters import needed_gain, overlapping, span_s, surroundings
from fieldkit.signal.leftovers import LEAST_TO_COMPARE, leftovers, stand_out
from fieldkit.signal.likelihood import ROUGHLY, fit_before
from fieldkit.signal.scan import MOST_AT_ONCE, Candidate, Region, scan, threshold
from fieldkit.signal.scatter import freedom_price, looser, scattered
from fieldkit.signal.traces import Component, Trace, component, decay_energy

_MOST_ROUNDS = 14
_LOOKED_FOR_ODD_TAPS = (2, 3, 4)
_MOST_PARTS = 60
_MOST_AT_A_TONE = 3
_AS_NOISE = 1.15
"""Residual over expected noise variance of a fit that no other start would better."""
NEARNESS = 0.1
"""Relative distance in frequency up to which what is far weaker may belong to a strong mode."""
FAR_WEAKER = 1e-2
_MOST_SATELLITES = 1
WANDER_REACH = 6e-3
"""Relative, how far from its typical frequency a machine's line is looked for."""


@dataclass(frozen=True)
class Found:
    """The components of a search, and places that were tried in vain."""

    parts: tuple[Component, ...]
    vain: tuple[complex, ...] = ()
    unresolved: tuple[tuple[complex, complex], ...] = ()
    """Pairs of poles too near each other to be told apart; one component stands for both."""
    odd: tuple[int, ...] = ()
    """Taps that cannot be explained together with the others; the search ended there."""
    crowded: bool = False
    """True where a strong mode drew in more than can ring beside it; the search ended there."""


def search(traces: Sequence[Trace], tones: Sequence[Component], region: Region) -> Found:
    """Add components until nothing significant is left."""
    found = Found(tuple(tones))
    for number in range(_MOST_ROUNDS):
        coarse = leftovers(traces, found.parts, region)
        odd = stand_out(coarse, traces, found.parts) if number in _LOOKED_FOR_ODD_TAPS else ()
        if odd:
            return replace(found, odd=odd)
        fresh = [
            c
            for c in scan(coarse, region)
            if not tried(c, found.vain, traces) and not crowded(c, found.parts)
        ]
        if not fresh or len(found.parts) > _MOST_PARTS:
            break
        before = found.parts
        looked = len(traces) < LEAST_TO_COMPARE or number >= _LOOKED_FOR_ODD_TAPS[-1]
        for candidate in fresh:
            found = add(traces, found, candidate, region)
            if looked and overcrowded(found.parts, traces):
                return replace(found, crowded=True)
        if found.parts is before and len(fresh) < MOST_AT_ONCE:
            break
    return found


def overcrowded(parts: Sequence[Component], traces: Sequence[Trace]) -> bool:
    """True where several far weaker modes stand about a strong one: its decay is no exponential."""
    modes = [p for p in parts if not p.steady]
    if len(modes) <= _MOST_SATELLITES:
        return False
    frequency_hz = np.array([p.frequency_hz for p in modes])
    energy = np.array([float(decay_energy(p, traces).sum()) for p in modes])
    distance = np.abs(np.subtract.outer(frequency_hz, frequency_hz))
    near = distance < NEARNESS * frequency_hz[:, None]
    weaker = energy[None, :] < FAR_WEAKER * energy[:, None]
    return bool(np.any(np.count_nonzero(near & weaker, axis=1) > _MOST_SATELLITES))


def tried(candidate: Candidate, vain: Sequence[complex], traces: Sequence[Trace]) -> bool:
    """True where an earlier candidate of about this pole was turned down."""
    spacing = 2 * np.pi / max(t.duration_s for t in traces)
    decay = -candidate.pole.real
    return any(
        abs(candidate.pole.imag - v.imag) < max(decay, spacing) and 0.3 < -v.real / decay < 3.3
        for v in vain
    )


def crowded(candidate: Candidate, parts: Sequence[Component]) -> bool:
    """True beside a tone that has drawn several components already: it is that tone's wander."""
    frequency_hz = candidate.pole.imag / (2 * np.pi)
    reach_hz = WANDER_REACH * frequency_hz
    near = [p for p in parts if abs(p.frequency_hz - frequency_hz) < reach_hz]
    return any(p.steady for p in near) and len(near) > _MOST_AT_A_TONE


def add(traces: Sequence[Trace], found: Found, candidate: Candidate, region: Region) -> Found:
    """The search with the candidate taken in, or explained otherwise, or noted as vain.

    What looks like a further mode beside one already found may be that one with a pole that differs
    from tap to tap; whichever says more with fewer parameters is kept.
    """
    new = component(candidate.pole, len(traces))
    near = overlapping(new, found.parts, span_s([new], traces))
    rest = without(found.parts, near)
    firm = [n for n in near if not scattered(n)]
    held = [*rest, *(n for n in near if scattered(n))]
    around = [*near, new]
    still = surroundings(traces, around, held, region.high_hz)
    before = fit_before(still, firm, ROUGHLY)
    needed = needed_gain(before.freedom, len(traces), threshold(len(traces), 100))
    useful = before.cost - needed
    after = fit_before(still, [*before.active, new], ROUGHLY, useful)
    if after.variance > _AS_NOISE:
        halves = split(before.active, new, traces)
        others = [fit_before(still, pair, ROUGHLY, useful) for pair in halves]
        after = min([after, *others], key=lambda fit: fit.cost)
    saved = before.cost - after.cost
    loose = looser(traces, near, rest, region.high_hz, before, around, least=saved)
    noise = max(min(after.variance, loose.variance if loose else np.inf), 1.0)
    gain = saved - needed * noise
    if loose is not None:
        price = freedom_price(near, len(traces), before.freedom)
        if before.cost - loose.cost - price * noise > max(gain, 0.0):
            return replace(found, parts=(*rest, *loose.parts))
    if gain < 0:
        return replace(found, vain=(*found.vain, candidate.pole))
    return replace(found, parts=(*updated(held, after.passive), *after.active))


def split(
    near: Sequence[Component], new: Component, traces: Sequence[Trace]
) -> list[list[Component]]:
    """Another start for a close pair: the mode next to the new one, split in two.

    What one mode leaves of a pair has its peaks beside the pair, not on it.
    """
    if not near:
        return []
    nearest = min(near, key=lambda p: abs(p.pole - new.pole))
    longest = max(t.duration_s for t in traces)
    shift = max(nearest.decay_per_s, np.pi / longest)
    if abs(new.pole.imag - nearest.pole.imag) > 8 * shift:
        return []
    decay = max(min(nearest.decay_per_s, -new.pole.real), 1 / longest)
    halves = [complex(-decay, nearest.pole.imag + sign * shift) for sign in (-1, 1)]
    others = [p for p in near if p is not nearest]
    return [[*others, *(nearest.with_pole(pole) for pole in halves)]]


def without(parts: Sequence[Component], gone: Sequence[Component]) -> list[Component]:
    """Parts less some of them, by identity."""
    names = {id(g) for g in gone}
    return [p for p in parts if id(p) not in names]


def updated(parts: Sequence[Component], fresh: Sequence[Component]) -> list[Component]:
    """Parts with the amplitudes of the fresh ones that have the same pole."""
    by_pole = {(p.pole, p.steady): p for p in fresh}
    return [by_pole.get((p.pole, p.steady), p) for p in parts]
