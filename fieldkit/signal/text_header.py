"""What stands above a table of numbers: column labels, and the rate where it is stated."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from fieldkit.signal.column_labels import Label, read_label, unit_in
from fieldkit.signal.text_cells import DATE, number_in, split_cells, without_comment_mark
from fieldkit.signal.text_layout import Layout

_LABEL_LINES = 3
"""Labels stand within this many lines above the first row."""
_HERTZ = {"hz": 1.0, "khz": 1e3, "1/s": 1.0, "sps": 1.0, "samples/s": 1.0, "s/s": 1.0, "": 1.0}
_SECONDS = {"s": 1.0, "sec": 1.0, "ms": 1e-3, "us": 1e-6, "\N{MICRO SIGN}s": 1e-6}
_RATE_UNIT = r"(?:hz|khz|1/s|sps|samples/s(?:ec(?:ond)?)?|s/s)"
_STEP_UNIT = "(?:sec|s|ms|us|\N{MICRO SIGN}s)"
_VALUE = r"(?P<value>[+-]?\d[\d.,]*(?:e[+-]?\d+)?)"
_RATE = re.compile(
    r"(?:^rate|\b(?:sampl\w*|scan|acquisition|data)[ _-]*(?:rate|freq\w*)|\b(?:fs|f_s)\b)"
    rf"\s*[\[(]?\s*(?P<before>{_RATE_UNIT})?\s*[\])]?\s*[:=;,\s]*{_VALUE}"
    rf"[\s\[(;,]*(?P<after>{_RATE_UNIT})?",
    re.IGNORECASE,
)
_STEP = re.compile(
    r"(?:\b(?:dt|delta[ _]?t)\b|\b(?:sampl\w*|time)[ _-]*(?:interval|period|step)\b)"
    rf"\s*[\[(]?\s*(?P<before>{_STEP_UNIT})?\s*[\])]?\s*[:=;,\s]*{_VALUE}"
    rf"[\s\[(;,]*(?P<after>{_STEP_UNIT})?\b",
    re.IGNORECASE,
)
_LABEL_WORD = re.compile(r"[^\s\[({]+(?:\s*[\[({][^\])}]*[\])}])?")


@dataclass(frozen=True)
class Header:
    """What the lines above the first row say."""

    labels: tuple[Label, ...]
    """One for each column; blank where nothing was said."""
    rates_hz: tuple[float, ...]
    """Every different rate that is stated."""


def read_header(lines: Sequence[str], layout: Layout) -> Header:
    """Labels from the last lines above the first row, rates from all of them."""
    above = lines[: layout.first_row]
    stated = (_rate_in(line, layout.decimal) for line in above)
    rates = dict.fromkeys(rate_hz for rate_hz in stated if rate_hz is not None)
    return Header(_labels(above, layout), tuple(rates))


def _labels(above: Sequence[str], layout: Layout) -> tuple[Label, ...]:
    columns = len(layout.kinds)
    candidates = [line for line in above if line.strip() and _rate_in(line, layout.decimal) is None]
    units = [""] * columns
    for line in reversed(candidates[-_LABEL_LINES:]):
        cells = _label_cells(line, layout)
        if cells is None:
            continue
        if any(units) or not _is_line_of_units(cells):
            return tuple(map(read_label, cells, units))
        units = cells
    return tuple(read_label("", unit) for unit in units)


def _label_cells(line: str, layout: Layout) -> list[str] | None:
    """A header line split into one cell for each column; None where it does not fit them."""
    text = without_comment_mark(line)
    columns = len(layout.kinds)
    if columns == 1:
        is_remark = text != line.strip() and ":" in text
        return None if is_remark or "=" in text else [text.strip('" ')]
    for delimiter in dict.fromkeys((layout.delimiter, "\t", ";", ",", None)):
        cells = _split_labels(text, delimiter, columns)
        if DATE in layout.kinds and len(cells) == columns - 1:
            cells.insert(layout.kinds.index(DATE), "")
        if len(cells) == columns:
            return cells
        if layout.delimiter is not None and layout.delimiter in text:
            return None
    return None


def _split_labels(text: str, delimiter: str | None, columns: int) -> list[str]:
    if delimiter is None:
        words = _LABEL_WORD.findall(text)
        return words if len(words) <= columns else _units_joined(words)
    cells = split_cells(text, delimiter)
    blank_at_end = text.count(delimiter) + 1 >= columns > len(cells) > 0
    return cells + [""] * (columns - len(cells)) if blank_at_end else cells


def _units_joined(words: Sequence[str]) -> list[str]:
    """Words with each bare unit joined to the word before it: ``velocity mm/s`` is one label."""
    labels: list[str] = []
    for word in words:
        if labels and unit_in(word) is not None:
            labels[-1] += f" {word}"
        else:
            labels.append(word)
    return labels


def _is_line_of_units(cells: Sequence[str]) -> bool:
    stripped = [cell.strip("[](){}<> ") for cell in cells]
    return any(stripped) and all(
        not cell or unit_in(cell) is not None or cell in ("V", "mV", "-", "1") for cell in stripped
    )


def _rate_in(line: str, decimal: str) -> float | None:
    """The sampling rate a line states, as rate or as time step; None where it states none."""
    text = line.strip().lstrip("#%/ ").replace('"', "")
    rate, step = _RATE.search(text), _STEP.search(text)
    if rate:
        unit = (rate["before"] or rate["after"] or "").lower()
        value = _number(rate["value"], decimal)
        return value * _HERTZ.get(unit, 1.0) if value else None
    if step:
        unit = (step["before"] or step["after"] or "s").lower()
        value = _number(step["value"], decimal)
        return 1.0 / (value * _SECONDS[unit]) if value else None
    return None


def _number(text: str, decimal: str) -> float | None:
    return number_in(text.rstrip(".,").replace(decimal, "."))
