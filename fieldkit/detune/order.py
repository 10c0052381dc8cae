"""The order changes are offered in, and which of many alike stands for the rest."""

from __future__ import annotations

from collections.abc import Sequence

from fieldkit.detune.candidates import Candidate
from fieldkit.detune.effort import effort
from fieldkit.detune.excitation import Goal
from fieldkit.detune.fixes import AddSupport, Change
from fieldkit.detune.push import held_axes, parts
from fieldkit.span.layout import Span

JUDGED = 12
PER_FAMILY = 5
CHANCE_STEP = 0.03
"""Chances closer than this count as equal when the smaller change is looked for."""
ALIKE_SHARE = 0.07
"""Changes closer along the span than this share of its length are one idea."""
WORTHWHILE = 0.02
"""A change must raise the chance by more than this to be listed."""

Key = tuple[float, ...]


def order(chance: float, change: Change, span: Span, goal: Goal, margin_left: float = 0.0) -> Key:
    """Sort key: chance down to ties, then the smaller change, then the wider separation."""
    step = int(min(chance, 1 - CHANCE_STEP / 2) / CHANCE_STEP)
    return (-step, round(effort(change, span, goal), 2), -margin_left, -chance)


def shortlist(
    candidates: Sequence[Candidate], span: Span, goal: Goal, chance_now: float
) -> list[Candidate]:
    """The best candidates that help at all, unlike each other, a few of each family."""
    better = [c for c in candidates if c.chance > chance_now + WORTHWHILE]
    ranked = sorted(better, key=lambda c: order(c.chance, c.change, span, goal))
    chosen: list[Candidate] = []
    for candidate in ranked:
        same = [c for c in chosen if c.change.kind == candidate.change.kind]
        if len(same) < PER_FAMILY and not any(
            alike(c.change, candidate.change, span) for c in same
        ):
            chosen.append(candidate)
        if len(chosen) == JUDGED:
            break
    return chosen


def alike(a: Change, b: Change, span: Span) -> bool:
    """Whether two changes are the same idea at nearly the same place."""
    ones, others = parts(a), parts(b)
    if len(ones) != len(others):
        return False
    if len(ones) == 1:
        return _alike_single(a, b, span)
    straight = all(_alike_single(x, y, span) for x, y in zip(ones, others, strict=True))
    crossed = all(_alike_single(x, y, span) for x, y in zip(ones, others[::-1], strict=True))
    return straight or crossed


def station(change: Change) -> float | None:
    """Where a single change acts anew; None where it stays at what is there."""
    found: float | None = getattr(change, "at_m", None)
    return found if found is not None else getattr(change, "to_m", None)


def idea(change: Change, span: Span) -> tuple[object, ...]:
    """What single changes of one idea have in common: kind, item, directions, nearly the place."""
    where = station(change)
    place = None if where is None else round(where / (ALIKE_SHARE * span.length_m))
    axes = tuple(held_axes(change)) if isinstance(change, AddSupport) else ()
    return (type(change), getattr(change, "index", None), axes, place)


def _alike_single(a: Change, b: Change, span: Span) -> bool:
    if type(a) is not type(b) or getattr(a, "index", None) != getattr(b, "index", None):
        return False
    where_a, where_b = station(a), station(b)
    if where_a is None or where_b is None:
        return True
    return abs(where_a - where_b) < ALIKE_SHARE * span.length_m
