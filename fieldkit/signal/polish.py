"""Last fits: every mode with the neighbours it overlaps, tones anew, leftovers where they pay."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from fieldkit.signal.bending import bent_fit
from fieldkit.signal.clusters import fit_together, overlapping, span_s, surroundings
from fieldkit.signal.likelihood import Fit
from fieldkit.signal.scan import Region
from fieldkit.signal.scatter import loosened, scattered
from fieldkit.signal.search import Found, updated, without
from fieldkit.signal.tones import refitted
from fieldkit.signal.traces import Component, Trace


@dataclass(frozen=True)
class Fitted:
    """A component and the fits that its uncertainty is read from."""

    part: Component
    fit: Fit
    """Of all taps with shared poles."""
    place: int
    """Which of the fit's active components it is."""
    tap_fits: tuple[Fit, ...] = ()
    """Of each tap alone, where the poles differ between taps."""
    later: Fitted | None = None
    """From later in the decay, where that was looked at."""


def polished(
    traces: Sequence[Trace], found: Found, region: Region, sweeps: int = 2
) -> tuple[Found, tuple[Fitted, ...]]:
    """The search result with every pole at its joint optimum, and the fits of the last sweep."""
    fitted: tuple[Fitted, ...] = ()
    for _ in range(sweeps):
        found = tones_anew(traces, found)
        found, fitted = swept(traces, found, region)
    return found, fitted


def tones_anew(traces: Sequence[Trace], found: Found) -> Found:
    """Amplitudes of the tones with the modes as they are now."""
    parts = list(found.parts)
    for tone in [p for p in parts if p.steady]:
        rest = without(parts, [tone])
        parts = [*rest, refitted(tone, rest, traces)]
    return replace(found, parts=tuple(parts))


def swept(
    traces: Sequence[Trace], found: Found, region: Region
) -> tuple[Found, tuple[Fitted, ...]]:
    """One pass over all groups of overlapping modes, strongest group first."""
    parts = list(found.parts)
    fitted: list[Fitted] = []
    for i, part in enumerate(parts):
        if part.bend:
            still = surroundings(traces, [part], without(parts, [part]), region.high_hz)
            result = bent_fit(still, part).fit
            parts[i] = result.active[0]
            fitted.append(Fitted(parts[i], result, 0))
    for group in groups(traces, parts):
        members = [parts[i] for i in group]
        rest = without(parts, members)
        shared = [m.with_pole(m.pole) for m in members]
        result = best_fit(traces, shared, rest, region)
        tap_fits: tuple[Fit, ...] = ()
        own = result.active
        if any(scattered(m) for m in members):
            loose = loosened(traces, members, rest, region.high_hz, members)
            tap_fits, own = loose.fits, loose.parts
        parts = in_place(parts, group, own, updated(rest, result.passive))
        fitted += [Fitted(p, result, i, tap_fits) for i, p in enumerate(own)]
    return replace(found, parts=tuple(parts)), tuple(fitted)


def in_place(
    parts: Sequence[Component],
    group: Sequence[int],
    own: Sequence[Component],
    rest: Sequence[Component],
) -> list[Component]:
    """Parts in their order, the group's members and the rest renewed."""
    members = dict(zip(group, own, strict=True))
    others = iter(rest)
    return [members[i] if i in members else next(others) for i in range(len(parts))]


def groups(traces: Sequence[Trace], parts: Sequence[Component]) -> list[list[int]]:
    """Indices of modes that overlap, directly or through others, strongest first."""
    order = [i for i, p in enumerate(parts) if not p.steady and not p.bend]
    order.sort(key=lambda i: -float(np.abs(parts[i].amplitudes).max()))
    left, out = set(order), []
    for i in order:
        if i not in left:
            continue
        near = overlapping(parts[i], parts, span_s([parts[i]], traces))
        names = {id(n) for n in near}
        group = [i, *[j for j in order if j in left and j != i and id(parts[j]) in names]]
        left -= set(group)
        out.append(group)
    return out


def best_fit(
    traces: Sequence[Trace],
    members: Sequence[Component],
    rest: Sequence[Component],
    region: Region,
) -> Fit:
    """The joint fit with a smooth leftover in the band only where it clearly lowers the cost."""
    plain = fit_together(traces, members, rest, region.high_hz, leftover_terms=0)
    smooth = fit_together(
        traces, plain.active, rest, region.high_hz, leftover_terms=2, over=members
    )
    numbers = 4 * len(traces)
    pays = plain.cost - smooth.cost > (numbers + 4 * np.sqrt(2 * numbers)) * smooth.variance
    return smooth if pays else plain
