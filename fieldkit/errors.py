"""What can go wrong, as a small tree.

FieldkitError
├── InputError    the input is bad: what, where, what was expected, what to do   (exit status 2)
├── Refusal       the input is good, yet it cannot answer: why, what to measure  (exit status 1)
└── Cancelled     the user asked to stop
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path


class FieldkitError(Exception):
    """Base of every error a user can cause or must be told about."""


@dataclass(frozen=True)
class Place:
    """Where in the user's input something stands."""

    file: Path | None = None
    line: int | None = None
    field: str | None = None
    """Key path in the job file, such as ``support[1].at``; counts from 0."""

    def __str__(self) -> str:
        parts = [str(self.file)] if self.file is not None else []
        if self.line is not None:
            parts.append(f"line {self.line}")
        if self.field is not None:
            parts.append(self.field)
        return ", ".join(parts)


class InputError(FieldkitError):
    """One clear sentence about bad input: what is wrong, where, and what to do about it."""

    def __init__(self, what: str, remedy: str = "", place: Place | None = None) -> None:
        self.what = what
        self.remedy = remedy
        self.place = place or Place()
        super().__init__(what)

    def at(
        self, *, file: Path | None = None, line: int | None = None, field: str | None = None
    ) -> InputError:
        """The same error with its place filled in where it was not known yet."""
        known = self.place
        place = replace(
            known,
            file=known.file or file,
            line=known.line or line,
            field=known.field or field,
        )
        return type(self)(self.what, self.remedy, place)

    def __str__(self) -> str:
        where = str(self.place)
        sentence = f"{where}: {self.what}" if where else self.what
        return f"{sentence}; {self.remedy}" if self.remedy else sentence


class Refusal(FieldkitError):
    """The data cannot answer the question; ``measure_next`` says what would."""

    def __init__(self, reason: str, measure_next: str = "") -> None:
        self.reason = reason
        self.measure_next = measure_next
        super().__init__(reason)

    def __str__(self) -> str:
        return f"{self.reason}; {self.measure_next}" if self.measure_next else self.reason


class Cancelled(FieldkitError):
    """The work was stopped on request; nothing is wrong."""
