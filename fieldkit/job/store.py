"""The job as the app edits it: the user's own text, changed key by key, saved in one piece."""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any

from fieldkit.errors import InputError, Place
from fieldkit.files import replace_file
from fieldkit.job import splice
from fieldkit.job.lines import Loc, Places, field_loc, places
from fieldkit.job.schema import parse_job
from fieldkit.job.syntax import read_file, read_table
from fieldkit.job.typed import rendered, text_of, value_of

if TYPE_CHECKING:
    from fieldkit.detune.fixes import Change
    from fieldkit.job.document import Job

_START = """\
fieldkit = 1
title = "New job"
units = "SI"

[pipe]
size = "NPS 3"
schedule = "40"
material = "carbon steel"

[contents]
name = "water"

[[leg]]
direction = "+x"
length = "4.0 m"

[[support]]
at = "0 m"
kind = "clamp"

[[support]]
at = "4.0 m"
kind = "clamp"
"""


@dataclass(frozen=True)
class JobText:
    """A job file's text; every edit gives a new one and touches nothing it need not.

    Fields are key paths such as ``support[1].at``, counted from 0. Edits need not make sense one
    by one: ``job`` judges the whole.
    """

    text: str
    path: Path | None = None
    marked: bool = False
    """Whether the file begins with a byte order mark, which is kept."""

    def __str__(self) -> str:
        return self.text

    @cached_property
    def table(self) -> dict[str, Any]:
        """The plain values of the whole text; raises InputError where it is not TOML."""
        return read_table(self.text, self.path)

    @cached_property
    def _places(self) -> Places:
        return places(self.text)

    def job(self) -> Job:
        """The job it describes; raises InputError with file, line and key."""
        return parse_job(self.text, self.path)

    def value(self, field: str) -> Any:
        """The value at a field as the file holds it; None where it is left out."""
        return _at(self.table, field_loc(field))

    def get(self, field: str) -> str:
        """The value at a field as one line of text, as it was typed; empty where left out."""
        loc = field_loc(field)
        return text_of(_at(self.table, loc), loc, self._places)

    def rows(self, table: str) -> list[dict[str, str]]:
        """The entries of a table as texts by key, nested keys dotted; one row for a plain table."""
        loc = field_loc(table) if table else ()
        found = _at(self.table, loc)
        if isinstance(found, list):
            return [self._row(entry, (*loc, i)) for i, entry in enumerate(found)]
        return [self._row(found, loc)] if isinstance(found, dict) else []

    def _row(self, entry: object, loc: Loc) -> dict[str, str]:
        row: dict[str, str] = {}
        for key, value in entry.items() if isinstance(entry, dict) else ():
            if isinstance(value, dict):
                inner = self._row(value, (*loc, key))
                row |= {f"{key}.{name}": text for name, text in inner.items()}
            elif not (isinstance(value, list) and value and isinstance(value[0], dict)):
                row[key] = text_of(value, (*loc, key), self._places)
        return row

    def with_value(self, field: str, value: object) -> JobText:
        """With a field changed, added, or taken out (None or blank text).

        Text is taken as a person types it (``1450 to 1495 rpm``, ``1, 2, 6``); any other value is
        written as it is. Raises InputError where the text is not TOML or has no such entry.
        """
        loc = self._checked(field_loc(field))
        if value is None or (isinstance(value, str) and not value.strip()):
            return self._with(splice.remove_value(self.text, loc))
        written = value_of(value, loc) if isinstance(value, str) else value
        return self._with(splice.set_value(self.text, loc, rendered(written)))

    def with_new(self, table: str, values: Mapping[str, object]) -> JobText:
        """With one more entry in a repeated table; blank values are left out.

        Dotted keys (``hammer.channel``) go into a table inside the entry.
        """
        self._checked((table,))
        index = len(self.table.get(table, []))
        given = {
            key: value
            for key, value in values.items()
            if value is not None and not (isinstance(value, str) and not value.strip())
        }
        pairs = {
            key: rendered(value_of(value, (table, index, key)) if isinstance(value, str) else value)
            for key, value in given.items()
            if "." not in key
        }
        added = self._with(splice.add_entry(self.text, table, pairs))
        for key in (key for key in given if "." in key):
            added = added.with_value(f"{table}[{index}].{key}", given[key])
        return added

    def without(self, table: str, index: int) -> JobText:
        """With an entry of a repeated table taken out."""
        self._checked((table, index))
        return self._with(splice.remove_entry(self.text, table, index))

    def moved(self, table: str, index: int, to: int) -> JobText:
        """With an entry of a repeated table at another place in its order."""
        self._checked((table, index))
        self._checked((table, to))
        return self._with(splice.move_entry(self.text, table, index, to))

    def with_change(self, change: Change) -> JobText:
        """With a fix adopted; raises InputError or Refusal where a job file cannot hold it."""
        from fieldkit.job.adopt import adopted

        return adopted(self, change)

    def save(self, path: Path | None = None) -> JobText:
        """Write it in one piece, so that a failure leaves the old file whole; raises InputError."""
        target = path or self.path
        if target is None:
            raise InputError("this job has no file yet", "name one to save it to")
        try:
            content = ("\ufeff" if self.marked else "") + self.text
            replace_file(Path(os.path.realpath(target)), content.encode("utf-8"))
        except (OSError, ValueError) as error:
            reason = getattr(error, "strerror", None) or str(error)
            what = f"it cannot be written ({reason.lower()})"
            raise InputError(what, "save it under another name", Place(target)) from None
        return replace(self, path=Path(target))

    def _with(self, text: str) -> JobText:
        return replace(self, text=text)

    def _checked(self, loc: Loc) -> Loc:
        """The path, once the text is TOML and every entry the path counts exists."""
        for depth, part in enumerate(loc):
            if isinstance(part, int):
                entries = _at(self.table, loc[:depth])
                if not isinstance(entries, list) or not 0 <= part < len(entries):
                    what = f"there is no {loc[depth - 1]} number {part + 1}"
                    raise InputError(what, "reload the job", Place(self.path))
        _ = self.table
        return loc


def load_text(path: Path) -> JobText:
    """Read a job file as text to edit; raises InputError where it cannot be read."""
    text, marked = read_file(Path(path))
    return JobText(text, Path(path), marked)


def new_job_text() -> JobText:
    """A small job to start from: one pipe, one leg, two clamps."""
    return JobText(_START)


def _at(value: Any, loc: Loc) -> Any:
    for part in loc:
        if isinstance(part, str) and isinstance(value, dict):
            value = value.get(part)
        elif isinstance(part, int) and isinstance(value, list) and 0 <= part < len(value):
            value = value[part]
        else:
            return None
    return value
