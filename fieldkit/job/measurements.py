"""What was measured: recordings with their calibration, and peaks typed in by hand."""

from __future__ import annotations

from pathlib import Path

from fieldkit.errors import InputError
from fieldkit.job.document import HammerEntry, RecordingEntry
from fieldkit.job.file_model import HammerTable, MeasuredTable, RecordingTable
from fieldkit.job.readers import bad
from fieldkit.quantity import scale_of, show
from fieldkit.signal.modes import MeasuredMode
from fieldkit.span.layout import END_TOLERANCE_M, Span

READING_DOUBT = 0.01
"""Standard deviation of a frequency read off a screen, relative, where none is stated
(common practice, no source)."""
TEXT_FILES = (".csv", ".tsv", ".txt", ".dat", ".asc")


def recording_entry(
    table: RecordingTable, index: int, span: Span, path: Path | None
) -> RecordingEntry:
    """An entry of the file; raises InputError at its key."""
    where = f"recording[{index}]"
    if not table.file.isprintable():
        raise bad(f"{where}.file", "the file name holds control characters", "rename the file")
    _check_at(table.at, span, where)
    folder = path.parent if path is not None else Path.cwd()
    return RecordingEntry(
        path=folder / table.file,
        kind=table.kind,
        state=table.state or ("tapped" if table.kind == "tap" else "running"),
        channel=table.channel,
        quantity=table.quantity,
        scale=_scale(table, table.quantity, table.file, where),
        direction=table.direction,
        at_m=table.at,
        rate_hz=table.rate,
        hammer=_hammer(table, span, where),
    )


def _hammer(table: RecordingTable, span: Span, where: str) -> HammerEntry | None:
    given = table.hammer
    if given is None:
        return None
    where = f"{where}.hammer"
    if table.kind != "tap":
        what = "a hammer belongs to a tap recording, and this one is of the running machine"
        raise bad(where, what, 'leave it out, or write kind = "tap"')
    if given.channel == table.channel:
        what = f"channel {given.channel} cannot be both the hammer and the sensor"
        raise bad(f"{where}.channel", what, "write the channel that the hammer is plugged into")
    _check_at(given.at, span, where)
    return HammerEntry(given.channel, _scale(given, "force", table.file, where), given.at)


def _scale(
    table: RecordingTable | HammerTable, quantity: str, file: str, where: str
) -> float | None:
    """SI units per unit of sample; None where the file does not say.

    A text file is taken to be in volts.
    """
    try:
        return scale_of(
            quantity,
            sensitivity=table.sensitivity,
            full_scale=table.full_scale,
            scale=table.scale,
            in_volts=file.lower().endswith(TEXT_FILES),
        )
    except InputError as error:
        raise bad(f"{where}.{error.place.field}", error.what, error.remedy) from None


def measured_mode(table: MeasuredTable, index: int, span: Span) -> MeasuredMode:
    """A typed-in peak; raises InputError at its key."""
    where = f"measured[{index}]"
    _check_at(table.at, span, where)
    sd = READING_DOUBT * table.frequency if table.sd is None else table.sd
    if sd >= table.frequency:
        what = "this standard deviation is as large as the frequency"
        raise bad(f"{where}.sd", what, 'write how far it may be off, such as "0.1 Hz"')
    return MeasuredMode(
        frequency_hz=table.frequency,
        frequency_sd_hz=sd,
        damping_ratio=table.damping,
        damping_sd=None,
        direction=table.direction,
        state=table.state,
        at_m=table.at,
        source="typed",
    )


def _check_at(at_m: float | None, span: Span, where: str) -> None:
    if at_m is not None and at_m > span.length_m + END_TOLERANCE_M:
        end = show(span.length_m, "length")
        what = f"{show(at_m, 'length')} lies beyond the end of the span at {end}"
        raise bad(f"{where}.at", what, "correct the station, or the length of the legs")
