"""Two changes together, where one alone does not reach the wanted chance.

The best single changes of every idea, judged by how many modes they leave in the bands, are
counted two by two on some of the members (the inertia of one small block matrix); the best pairs
are counted on all, and their sizes and places improved.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace
from itertools import combinations, pairwise
from typing import Any

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.candidates import Candidate, Search, round_mass
from fieldkit.detune.effort import effort
from fieldkit.detune.fixes import (
    AddMass,
    AddSupport,
    AllOf,
    Change,
    MoveMass,
    MoveSupport,
    StiffenSupport,
)
from fieldkit.detune.order import alike, idea, order
from fieldkit.detune.push import Push, held_axes, parts, removals
from fieldkit.detune.screen import Counter, clear
from fieldkit.progress import Progress

Array = NDArray[np.float64]
Index = NDArray[np.intp]

PARTNERS = 48
PER_KIND = 20
FIRST_MEMBERS = 64
COUNTED_IN_FULL = 30
AT_ONCE = 64
HELPS = 0.05
"""Modes fewer in the bands, on average, that make a change worth pairing."""
IMPROVED = 4
ROUNDS = 2
SIZES = (0.35, 0.5, 0.7, 1.4, 2.0, 3.0)
STEPS = (-2, -1, 1, 2)


def pairs(search: Search, singles: Sequence[Candidate], progress: Progress) -> list[Candidate]:
    """The best pairs of single changes, best first."""
    partners = _partners(search, singles)
    if len(partners) < 2:
        return []
    progress.step("trying pairs of changes", 0.0)
    counted = _counted(search, partners, progress.within(0.0, 0.4))
    best = sorted(counted, key=lambda c: _key(search, c))[:COUNTED_IN_FULL]
    whole = []
    for i, candidate in enumerate(best):
        progress.step("trying pairs of changes", 0.4 + 0.2 * i / len(best))
        whole.append(search.counted(candidate.change))
    whole.sort(key=lambda c: _key(search, c))
    improved: list[Candidate] = []
    for candidate in whole:
        if len(improved) == IMPROVED:
            break
        if not any(alike(c.change, candidate.change, search.span) for c in improved):
            share = 0.6 + 0.4 * len(improved) / IMPROVED
            improved.append(_improved(search, candidate, progress.within(share, share)))
    return sorted([*improved, *whole], key=lambda c: _key(search, c))


def _key(search: Search, candidate: Candidate) -> tuple[float, ...]:
    return order(candidate.chance, candidate.change, search.span, search.goal)


def _partners(search: Search, singles: Sequence[Candidate]) -> list[Candidate]:
    """The best of every idea: fewest modes left in the bands, then the smaller change."""

    def key(candidate: Candidate) -> tuple[float, float]:
        size = effort(candidate.change, search.span, search.goal)
        return (round(candidate.left, 1), size)

    best: dict[tuple[object, ...], Candidate] = {}
    now = search.candidate(AllOf(()), search.counter().base).left
    for candidate in (c for c in singles if c.left < now - HELPS):
        of_idea = idea(candidate.change, search.span)
        if of_idea not in best or key(candidate) < key(best[of_idea]):
            best[of_idea] = candidate
    chosen: list[Candidate] = []
    for candidate in sorted(best.values(), key=key):
        same = sum(c.change.kind == candidate.change.kind for c in chosen)
        if same < PER_KIND and len(chosen) < PARTNERS:
            chosen.append(candidate)
    return chosen


def _counted(search: Search, partners: Sequence[Candidate], progress: Progress) -> list[Candidate]:
    """Every pair of partners, counted on some members."""
    every = np.arange(search.field.members) if search.pick is None else search.pick
    members = every[np.unique(np.linspace(0, len(every) - 1, FIRST_MEMBERS).astype(int))]
    pushes = [
        removals(search.field, replace_scatter(search, i).push(c.change))
        for i, c in enumerate(partners)
    ]
    ends = np.cumsum([0, *(push.rows.shape[1] for push in pushes)])
    own = [np.arange(a, b) for a, b in pairwise(ends)]
    count = search.counter().some(members)
    rows = np.concatenate([push.rows[members] for push in pushes], axis=1)
    progress.step("trying pairs of changes", 0.0)
    receptance = _all_receptances(count, rows @ count.field.modes.vector)
    progress.step("trying pairs of changes", 0.0)
    receptance += _residual(search, pushes, own)
    softness = np.concatenate([search.counter().softness(p)[members] for p in pushes], axis=2)
    found: list[Candidate] = []
    possible = [
        (i, j, AllOf((partners[i].change, partners[j].change)))
        for i, j in combinations(range(len(partners)), 2)
        if _possible(search, partners[i].change, partners[j].change)
    ]
    for size in sorted({len(own[i]) + len(own[j]) for i, j, _ in possible}):
        alike_sized = [p for p in possible if len(own[p[0]]) + len(own[p[1]]) == size]
        for first in range(0, len(alike_sized), AT_ONCE):
            progress.step("trying pairs of changes", len(found) / len(possible))
            some = alike_sized[first : first + AT_ONCE]
            at = np.stack([np.concatenate([own[i], own[j]]) for i, j, _ in some])
            block = np.moveaxis(receptance[:, :, at[:, :, None], at[:, None, :]], 2, 0)
            after = count.with_update(block, np.moveaxis(softness[:, :, at], 2, 0))
            chance = clear(after).mean(axis=1)
            found += [Candidate(p[2], float(c), 0.0) for p, c in zip(some, chance, strict=True)]
    return found


def replace_scatter(search: Search, part: int) -> Search:
    """The search with the scatter of the nth part of a change."""
    return replace(search, scatter=search.scatter.of(part))


def _residual(search: Search, pushes: Sequence[Push], own: Sequence[Index]) -> Array:
    """(P, P) static flexibility between all rows, each push's own as it has it."""
    residual = search.field.ports.residual_of(np.concatenate([push.full for push in pushes]))
    for push, at in zip(pushes, own, strict=True):
        residual[np.ix_(at, at)] = push.residual
    return residual


def _all_receptances(count: Counter, shape: Array) -> Array:
    """(members, edges, P, P) between all rows of all partners."""
    gap = count.field.modes.eigenvalue[:, None, :] - count.edge_rad_per_s[None, :, None] ** 2
    weighted = shape[:, None] / gap[:, :, None, :]
    return np.asarray(weighted @ np.swapaxes(shape, 1, 2)[:, None])


def _possible(search: Search, first: Change, second: Change) -> bool:
    """Not the same item twice, nor one change beside its like."""
    if alike(first, second, search.span):
        return False
    supports = [
        part.index for part in (first, second) if isinstance(part, MoveSupport | StiffenSupport)
    ]
    masses = [
        part.index for part in (first, second) if part.kind == "mass" and hasattr(part, "index")
    ]
    return len(supports) == len(set(supports)) and len(masses) == len(set(masses))


def _improved(search: Search, candidate: Candidate, progress: Progress) -> Candidate:
    """The pair with each part made softer, lighter, stiffer, heavier or set beside, if better."""
    best = candidate
    for _ in range(ROUNDS):
        before = best
        for i in range(len(parts(best.change))):
            for variant in _variants(search, parts(best.change)[i]):
                progress.step("improving the best pairs", 0.0)
                others = list(parts(best.change))
                others[i] = variant
                if not _possible(search, *others):
                    continue
                tried = search.counted(AllOf(tuple(others)))
                if _key(search, tried) < _key(search, best):
                    best = tried
        if best is before:
            break
    return best


def _variants(search: Search, change: Change) -> Iterable[Change]:
    """Neighbours of a single change in size, directions and place."""
    if isinstance(change, AddSupport | StiffenSupport):
        held = held_axes(change)
        for factor in SIZES:
            scaled: dict[str, Any] = {
                f"{axis}_n_per_m": float(f"{factor * k:.1e}") for axis, k in held.items()
            }
            levels = search.stiffness_levels()
            if all(levels[0] <= k <= levels[-1] for k in scaled.values()):
                yield replace(change, **scaled)
        if len(held) > 1:
            for axis in held:
                dropped: dict[str, Any] = {f"{axis}_n_per_m": None}
                yield replace(change, **dropped)
    if isinstance(change, AddMass):
        levels = search.mass_levels()
        for factor in SIZES:
            kg = round_mass(factor * change.mass_kg)
            if levels[0] <= kg <= levels[-1]:
                yield replace(change, mass_kg=kg)
    for at_m in _beside(search, change):
        key = "to_m" if isinstance(change, MoveSupport | MoveMass) else "at_m"
        yield replace(change, **{key: at_m})  # type: ignore[type-var]


def _beside(search: Search, change: Change) -> list[float]:
    """Grid stations a step or two away where something may be attached."""
    here = getattr(change, "at_m", getattr(change, "to_m", None))
    if here is None:
        return []
    places = search.attachable()
    nearest = int(np.argmin(np.abs(np.array(places) - here)))
    wanted = [nearest + step for step in STEPS]
    return [places[i] for i in wanted if 0 <= i < len(places)]
