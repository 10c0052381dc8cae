"""A recording out of a table of numbers: which column is time, and at what rate."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import InputError, Place
from fieldkit.signal.column_labels import TIME, Label
from fieldkit.signal.text_cells import CLOCK, NUMBER, fraction_digits, split_cells, with_point
from fieldkit.signal.text_header import Header, read_header
from fieldkit.signal.text_layout import Layout, find_layout
from fieldkit.signal.text_lines import open_lines
from fieldkit.signal.text_numbers import Table, read_table
from fieldkit.signal.time_axis import (
    EvenSamples,
    SamplingTimes,
    even_samples,
    mean_rate,
    rises_evenly,
)

SAME_RATE_WITHIN = 0.01
"""A rate that is stated and one that the time column gives agree within this share."""
_SLOWEST_HZ = 100.0
_CELLS_LOOKED_AT = 1000


@dataclass(frozen=True)
class TextSamples:
    """What a text file holds."""

    samples: NDArray[np.float64]
    """(n, channels), in the columns' own units."""
    rate_hz: float
    labels: tuple[Label, ...]
    """One for each channel."""
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class _TextFile:
    path: Path
    lines: Sequence[str]
    layout: Layout
    header: Header
    table: Table


def read_text(path: Path, stated_hz: float | None = None) -> TextSamples:
    """Read columns of numbers, with a time column or a rate that the header or the caller states.

    Raises InputError with the line of whatever cannot be read, and where no rate is known.
    """
    with open_lines(path) as lines:
        layout = find_layout(lines, path)
        header, table = read_header(lines, layout), read_table(lines, layout, path)
        return _recorded(_TextFile(path, lines, layout, header, table), stated_hz)


def _recorded(file: _TextFile, stated_hz: float | None) -> TextSamples:
    path, layout = file.path, file.layout
    time_columns = _time_columns(file)
    dropped = (*time_columns, *_counter_columns(file, time_columns))
    kept = [column for column in range(len(layout.kinds)) if column not in dropped]
    if not kept:
        raise InputError(
            "there is no column of samples beside the time", "export the signal too", Place(path)
        )
    samples = _columns(file.table.values, kept)
    even = _even(file, time_columns, samples, stated_hz)
    labels = tuple(_measured(file.header.labels[column]) for column in kept)
    return TextSamples(even.samples, even.rate_hz, labels, (*even.notes, *_label_notes(labels)))


def _columns(values: NDArray[np.float64], kept: Sequence[int]) -> NDArray[np.float64]:
    """Some columns of a table; those that stand side by side are not copied."""
    first, past = kept[0], kept[-1] + 1
    return values[:, first:past] if past - first == len(kept) else values[:, list(kept)]


def _measured(label: Label) -> Label:
    """A second time column is read as a channel, of no quantity."""
    return Label(label.name) if label.quantity == TIME else label


def _time_columns(file: _TextFile) -> tuple[int, ...]:
    """Columns whose sum is the time: clock and date, or the one that says or looks like time."""
    kinds, labels = file.layout.kinds, file.header.labels
    clocks = tuple(column for column, kind in enumerate(kinds) if kind != NUMBER)
    if clocks:
        return clocks
    named = next((i for i, label in enumerate(labels) if label.quantity == TIME), None)
    if named is not None:
        return (named,)
    first = labels[0]
    unknown = first.quantity is None and not first.is_counter
    rising = len(kinds) > 1 and unknown and rises_evenly(file.table.values[:, 0])
    return (0,) if rising and not _counts(file.table.values[:, 0]) else ()


def _counter_columns(file: _TextFile, time_columns: tuple[int, ...]) -> tuple[int, ...]:
    """A first column that only numbers the samples."""
    label = file.header.labels[0]
    unsaid = label.quantity is None and (label.is_counter or not label.name)
    counting = 0 not in time_columns and unsaid and _counts(file.table.values[:, 0])
    return (0,) if counting and len(file.layout.kinds) > 1 else ()


def _counts(column: NDArray[np.float64]) -> bool:
    return len(column) > 2 and column[0] in (0.0, 1.0) and bool(np.all(np.diff(column) == 1.0))


def _even(
    file: _TextFile,
    time_columns: tuple[int, ...],
    samples: NDArray[np.float64],
    stated_hz: float | None,
) -> EvenSamples:
    header_hz = file.header.rates_hz
    if not time_columns:
        return EvenSamples(samples, _stated_rate(file.path, header_hz, stated_hz))
    if len(samples) < 2:
        raise InputError("there is only one row", "export the whole recording", Place(file.path))
    likely_hz = stated_hz or (header_hz[0] if len(header_hz) == 1 else None)
    times = _sampling_times(file, time_columns, likely_hz)
    even = even_samples(times, samples, likely_hz)
    if stated_hz is not None and not _same_rate(even.rate_hz, stated_hz):
        raise InputError(
            f"the time column gives {even.rate_hz:.6g} Hz, and {stated_hz:.6g} Hz was stated",
            "leave the stated rate out, or remove the time column",
            Place(file.path),
        )
    notes = even.notes
    if likely_hz is not None and not _same_rate(even.rate_hz, likely_hz):
        notes += (
            f"the header states {likely_hz:.6g} Hz; the time column, which gives "
            f"{even.rate_hz:.6g} Hz, was used",
        )
    return EvenSamples(even.samples, even.rate_hz, notes)


def _stated_rate(path: Path, header_hz: tuple[float, ...], stated_hz: float | None) -> float:
    if stated_hz is not None:
        return stated_hz
    if len(header_hz) > 1:
        raise InputError(
            f"the header states several rates: {', '.join(f'{rate:.6g} Hz' for rate in header_hz)}",
            "state the one that holds",
            Place(path),
        )
    if header_hz:
        return header_hz[0]
    raise InputError(
        "no sampling rate is known: there is no time column and none is stated",
        "state the rate, or add a line such as '# rate 2048 Hz' at the top",
        Place(path),
    )


def _same_rate(a_hz: float, b_hz: float) -> bool:
    return math.isclose(a_hz, b_hz, rel_tol=SAME_RATE_WITHIN)


def _sampling_times(
    file: _TextFile, columns: tuple[int, ...], likely_hz: float | None
) -> SamplingTimes:
    written = file.table.values[:, columns[0]]
    for column in columns[1:]:
        written = written + file.table.values[:, column]
    digits = _resolution(file, columns, written)
    scale = _time_scale(file, columns, written, likely_hz)
    seconds = written if scale == 1.0 else written * scale
    return SamplingTimes(seconds, digits * scale, file.table.lines, file.path)


def _time_scale(
    file: _TextFile, columns: tuple[int, ...], written: NDArray[np.float64], likely_hz: float | None
) -> float:
    """Seconds per unit of the time column."""
    stated = file.header.labels[columns[0]].scale
    if file.layout.kinds[columns[0]] != NUMBER:
        return 1.0
    if stated is not None:
        return stated
    as_seconds_hz = mean_rate(written)
    for scale in (1.0, 1e-3, 1e-6):
        if likely_hz is not None and _same_rate(as_seconds_hz / scale, likely_hz):
            return scale
    if as_seconds_hz < _SLOWEST_HZ * (1 - SAME_RATE_WITHIN):
        raise InputError(
            f"the time column has no unit, and taken as seconds it gives {as_seconds_hz:.4g} Hz",
            "say its unit in the header, such as 't (ms)'",
            Place(file.path, file.layout.first_row + 1),
        )
    return 1.0


def _resolution(
    file: _TextFile, columns: tuple[int, ...], written: NDArray[np.float64]
) -> NDArray[np.float64]:
    """What the last digit of each time stands for, from how a share of them are written.

    Fixed decimals show in the most decimals seen; a fixed count of digits, in the most digits.
    """
    step = max(1, len(file.table.lines) // _CELLS_LOOKED_AT)
    lines = (file.lines[int(line) - 1] for line in file.table.lines[::step])
    rows = [split_cells(line, file.layout.delimiter) for line in lines]
    clock = next((i for i in columns if file.layout.kinds[i] == CLOCK), None)
    if clock is not None:
        decimals = max(fraction_digits(row[clock]) for row in rows)
        return np.broadcast_to(np.float64(10.0**-decimals), written.shape)
    cells = [with_point(row[columns[0]], file.layout.decimal) for row in rows]
    decimals, significant = (max(counts) for counts in zip(*map(_digits, cells), strict=True))
    largest = max(-float(written.min()), float(written.max()))
    if largest < 10.0 ** (significant - decimals):
        return np.broadcast_to(np.float64(10.0**-decimals), written.shape)
    with np.errstate(divide="ignore"):
        exponent = np.floor(np.log10(np.abs(written)))
    resolution: NDArray[np.float64] = np.maximum(
        10.0**-decimals, 10.0 ** (exponent + 1 - significant)
    )
    return resolution


def _digits(number: str) -> tuple[int, int]:
    """Decimals of a number after the point, its exponent counted in, and its digits in all."""
    mantissa, _, exponent = number.lower().replace("d", "e").partition("e")
    whole, _, fraction = mantissa.lstrip("+-").partition(".")
    decimals = len(fraction) - int(exponent or 0)
    return decimals, max(1, len((whole + fraction).lstrip("0")))


def _label_notes(labels: tuple[Label, ...]) -> tuple[str, ...]:
    return tuple(
        f"channel {i}: its name {label.name!r} and its unit, one of {label.conflict}, contradict "
        "each other; taken as uncalibrated"
        for i, label in enumerate(labels, start=1)
        if label.conflict
    )
