"""Backward elimination: drop what the others can explain after a refit."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from fieldkit.signal.clusters import alike, needed_gain, overlapping, span_s, surroundings
from fieldkit.signal.likelihood import ROUGHLY, fit_before
from fieldkit.signal.scan import Region, threshold
from fieldkit.signal.scatter import freedom_price, looser, scattered
from fieldkit.signal.search import Found, updated, without
from fieldkit.signal.traces import Component, Trace

_RESOLVED = 0.5
_ALIKE = 3.0
_NO_DECAY = 0.12
"""Decays over the whole record below which a line is taken as steady."""


def pruned(traces: Sequence[Trace], found: Found, region: Region) -> Found:
    """The search result less every mode that does not pay for itself, weakest first."""
    parts = list(found.parts)
    unresolved: list[tuple[complex, complex]] = []
    for part in sorted((p for p in parts if not p.steady), key=peak_amplitude):
        current = nearest_pole(part, parts)
        if current is None:
            continue
        twin = next((p for p in parts if twins(p, current)), None)
        parts, poor = without_if_idle(traces, parts, current, region, must_go=twin is not None)
        unresolved += [(current.pole, twin.pole)] if twin is not None and poor else []
    settled = apart([still(p, traces) for p in parts], traces)
    return replace(found, parts=settled, unresolved=tuple(unresolved))


def apart(parts: Sequence[Component], traces: Sequence[Trace]) -> tuple[Component, ...]:
    """Parts less the weaker ones of tones too near each other to be two."""
    least_hz = 0.5 / max(t.duration_s for t in traces)
    kept: list[Component] = []
    for part in sorted(parts, key=peak_amplitude, reverse=True):
        tones = [k for k in kept if k.steady and part.steady]
        if all(abs(part.frequency_hz - k.frequency_hz) > least_hz for k in tones):
            kept.append(part)
    return tuple(kept)


def still(part: Component, traces: Sequence[Trace]) -> Component:
    """A component that does not decay over the record becomes a steady tone."""
    longest = max(t.duration_s for t in traces)
    if part.steady or part.decay_per_s * longest > _NO_DECAY:
        return part
    return replace(part.with_pole(1j * part.pole.imag), steady=True)


def twins(one: Component, other: Component) -> bool:
    """True for two modes nearer to each other than half their bandwidth: not to be told apart."""
    if one is other or one.steady or other.steady:
        return False
    if not alike(one, other, _ALIKE, np.inf):
        return False
    apart_hz = abs(one.frequency_hz - other.frequency_hz)
    return apart_hz < _RESOLVED * (one.half_power_hz + other.half_power_hz) / 2


def nearest_pole(part: Component, parts: Sequence[Component]) -> Component | None:
    """The component that a part has become after refits; None where it is gone."""
    modes = [p for p in parts if not p.steady]
    nearest = min(modes, key=lambda p: abs(p.pole - part.pole), default=None)
    gone = nearest is None or abs(nearest.pole - part.pole) > 2 * part.decay_per_s
    return None if gone else nearest


def without_if_idle(
    traces: Sequence[Trace],
    parts: Sequence[Component],
    current: Component,
    region: Region,
    *,
    must_go: bool,
) -> tuple[list[Component], bool]:
    """Parts refitted around one of them, without it where that costs too little or it must go.

    "Without" also means its neighbours with poles of their own in every tap. The second value is
    True where leaving it out leaves something unexplained.
    """
    near = overlapping(current, parts, span_s([current], traces))
    rest = without(parts, [*near, current])
    firm = [p for p in (*near, current) if not scattered(p)]
    held = [*rest, *(n for n in (*near, current) if scattered(n))]
    around, top_hz = [*near, current], region.high_hz
    still = surroundings(traces, around, held, top_hz)
    with_it = fit_before(still, firm, ROUGHLY)
    left = [p for p in firm if p is not current]
    if scattered(current):
        still = surroundings(traces, around, without(held, [current]), top_hz)
    freedom = with_it.freedom + 2 + 2 * len(traces)
    worth = needed_gain(freedom, len(traces), threshold(len(traces), 100))
    if scattered(current):
        worth += freedom_price([current], len(traces), freedom)
    useful = np.inf if must_go else with_it.cost + worth * max(with_it.variance, 1.0)
    alone = fit_before(still, left, ROUGHLY, useful)
    saved = alone.cost - with_it.cost
    loose = looser(traces, near, rest, top_hz, alone, around, least=saved)
    noise = max(min(with_it.variance, loose.variance if loose else np.inf), 1.0)
    worth *= noise
    kept = np.inf if must_go else with_it.cost + worth
    if loose is not None:
        price = freedom_price(near, len(traces), alone.freedom) * noise
        if loose.cost + price < min(kept, alone.cost):
            return [*rest, *loose.parts], loose.cost > with_it.cost + worth
    if alone.cost < kept:
        left = [*updated(without(held, [current]), alone.passive), *alone.active]
        return left, alone.cost > with_it.cost + worth
    return [*updated(held, with_it.passive), *with_it.active], False


def peak_amplitude(part: Component) -> float:
    """Largest amplitude over the taps."""
    return float(np.abs(part.amplitudes).max())
