"""The rows of a job as the Span view lists them, and the texts a form starts with."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

from fieldkit.ui.forms.tables import FORMS, ORDER_OF_ROWS, Form

if TYPE_CHECKING:
    from fieldkit.job.store import JobText


@dataclass(frozen=True)
class JobRow:
    """One line of the description."""

    table: str
    index: int | None
    """Row of a repeated table, from 0."""
    label: str
    value: str
    """As typed, shortened to what tells it apart."""

    @property
    def key(self) -> str:
        """Unique."""
        return f"{self.table}.{self.index}"


def row_label(form: Form, index: int | None) -> str:
    """``Support 2``; people count from 1."""
    return form.title if index is None else f"{form.title} {index + 1}"


def rows_of(text: JobText | None) -> tuple[JobRow, ...]:
    """Every row of the description, in the order of the file format."""
    if text is None:
        return ()
    return tuple(row for table in ORDER_OF_ROWS for row in _rows(text, FORMS[table]))


def _rows(text: JobText, form: Form) -> Iterator[JobRow]:
    found = text.rows(form.table)
    if not form.repeated:
        found = found[:1] or [{}]
    for number, values in enumerate(found):
        index = number if form.repeated else None
        yield JobRow(form.table, index, row_label(form, index), _in_short(form, values))


def _in_short(form: Form, values: dict[str, str]) -> str:
    """What was typed, in the order of the form; names only where a bare value would puzzle."""
    said = [
        f"{field.label if field.said is None else field.said} {values[field.key]}".strip()
        for field in form.fields
        if values.get(field.key)
    ]
    return ", ".join(said) or "as usual"


def texts_of(text: JobText, form: Form, index: int | None) -> dict[str, str]:
    """What stands in the file for each field of a form."""
    rows = text.rows(form.table)
    number = index or 0
    return rows[number] if number < len(rows) else {}


def with_values(text: JobText, form: Form, index: int | None, values: Mapping[str, str]) -> JobText:
    """The text with the typed values in one row; a negative index adds the row."""
    if index is not None and index < 0:
        return text.with_new(form.table, values)
    start = f"{form.table}." if form.table else ""
    if index is not None:
        start = f"{form.table}[{index}]."
    for key, typed in values.items():
        text = text.with_value(f"{start}{key}", typed)
    return text


def without_taps(text: JobText) -> JobText:
    """The text without tap recordings and typed peaks: they are of the pipe before a change."""
    taps = [i for i, row in enumerate(text.rows("recording")) if row.get("kind") == "tap"]
    for index in reversed(taps):
        text = text.without("recording", index)
    for index in reversed(range(len(text.rows("measured")))):
        text = text.without("measured", index)
    return text
