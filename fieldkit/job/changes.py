"""What tells one text of a job from another, in a few words: what undo takes back."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

from fieldkit.job.store import JobText

_MOST = 2
"""Parts named before the rest is summed up."""
_LONGEST = 28


def change_label(before: JobText, after: JobText) -> str:
    """``support 2 vertical: unknown → 3.5 MN/m``, ``mass 1 added``, ``comments``."""
    parts = list(_differences(before.table, after.table))
    if not parts:
        return "comments"
    shown = "; ".join(parts[:_MOST])
    more = len(parts) - _MOST
    return f"{shown} and {more} more" if more > 0 else shown


def _differences(before: Mapping[str, Any], after: Mapping[str, Any]) -> Iterator[str]:
    for key in dict.fromkeys([*before, *after]):
        old, new = before.get(key), after.get(key)
        if old == new:
            continue
        known = old or new
        if isinstance(known, list) and isinstance(known[0], dict):
            yield from _entries(key, old or [], new or [])
        elif isinstance(known, dict):
            yield from _keys(key, old or {}, new or {})
        else:
            yield _turned(key, old, new)


def _entries(name: str, old: list[Any], new: list[Any]) -> Iterator[str]:
    if len(old) == len(new):
        for number, (before, after) in enumerate(zip(old, new, strict=True), start=1):
            yield from _keys(f"{name} {number}", before, after)
        return
    word, longer, shorter = ("added", new, old) if len(new) > len(old) else ("removed", old, new)
    at = [number for number, entry in enumerate(longer, start=1) if entry not in shorter]
    count = len(longer) - len(shorter)
    yield f"{name} {at[0]} {word}" if count == 1 and at else f"{count} x {name} {word}"


def _keys(name: str, old: Mapping[str, Any], new: Mapping[str, Any]) -> Iterator[str]:
    for key in dict.fromkeys([*old, *new]):
        before, after = old.get(key), new.get(key)
        if before == after:
            continue
        if isinstance(before, dict) and isinstance(after, dict):
            yield from _keys(f"{name} {key}", before, after)
        else:
            yield _turned(f"{name} {key}", before, after)


def _turned(name: str, old: object, new: object) -> str:
    return f"{name.replace('_', ' ')}: {_in_words(old)} → {_in_words(new)}"


def _in_words(value: object) -> str:
    if value is None:
        return "left out"
    if isinstance(value, list) and value and isinstance(value[0], dict):
        return f"{len(value)} entries"
    text = ", ".join(str(item) for item in value) if isinstance(value, list) else str(value)
    return text if len(text) <= _LONGEST else f"{text[: _LONGEST - 1]}…"
