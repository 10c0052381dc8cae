"""What was measured: recordings, taps, modes, spectra and decays."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from fieldkit.detune.excitation import Band
from fieldkit.job.document import RecordingEntry
from fieldkit.quantity import show
from fieldkit.sheet import responses, tables
from fieldkit.sheet.basis import Basis
from fieldkit.sheet.beyond import Results
from fieldkit.sheet.content import (
    Block,
    Figure,
    Heading,
    Paragraph,
    Section,
    Table,
    bullets,
    paragraphs,
    section,
    sentence,
    table,
)
from fieldkit.sheet.figure_spectra import Marks, tap_figure
from fieldkit.signal.recording import SI_UNIT
from fieldkit.workup import ResponseReading, RunningReading, TapReading, response_notes

NO_RECORDING = (
    "No recording belongs to this job. Record taps with fieldkit record, or name recordings in the "
    "job file."
)
NO_TAP = (
    "No tap recording was read. Strike the pipe with a soft hammer, machine stopped, at least "
    "three times, and add the recording to the job."
)


def recordings(found: Results) -> Section:
    """Each recording with its sensor, sensitivity, direction, place and hash."""
    job, basis = found.work.job, found.basis
    if not job.recordings:
        return section("Recordings", [Paragraph(NO_RECORDING)])
    simulated = set(found.work.simulated)
    read_in: list[TapReading | RunningReading] = [*found.work.taps, *found.work.running]
    lengths = {reading.entry: (reading.duration_s, reading.rate_hz) for reading in read_in}
    placed, meant = [], []
    for i, entry in enumerate(job.recordings, start=1):
        mark = " (SIMULATED)" if entry.path.name in simulated else ""
        read = lengths.get(entry)
        length = f"{read[0]:.1f} s at {read[1]:g} Hz" if read else "not read"
        direction = entry.direction or "not stated"
        where = _place(entry, job.units)
        placed.append(
            (
                f"R{i}",
                entry.path.name + mark,
                entry.kind,
                entry.state,
                direction,
                where,
                length,
                basis.recordings[entry.path].sha256[:12] or "cannot be read",
            )
        )
        said = sensitivity(entry, _typed(basis, i - 1))
        meant.append((f"R{i}", str(entry.channel), entry.quantity, said, _hammer(entry, job.units)))
    where_from = ("", "file", "kind", "state", "direction", "sensor at", "length", "sha-256 begins")
    sensors = ("", "channel", "quantity", "sensitivity used", "hammer")
    return section(
        "Recordings",
        [
            Table("What was recorded", where_from, tuple(placed)),
            Table("With which sensor", sensors, tuple(meant)),
        ],
    )


def _hammer(entry: RecordingEntry, units: str) -> str:
    hammer = entry.hammer
    if hammer is None:
        return "no force recorded"
    at = "not stated where" if hammer.at_m is None else f"at {show(hammer.at_m, 'length', units)}"
    scale = "uncalibrated" if hammer.scale is None else f"{hammer.scale:.4g} N per unit"
    return f"channel {hammer.channel}, {scale}, struck {at}"


def _typed(basis: Basis, index: int) -> Mapping[str, Any]:
    return basis.typed[index] if index < len(basis.typed) else {}


def sensitivity(entry: RecordingEntry, typed: Mapping[str, Any]) -> str:
    """The factor used, and what the job file says of it."""
    if entry.scale is None:
        said = "uncalibrated in the job; amplitudes relative"
    else:
        said = f"{entry.scale:.4g} {SI_UNIT[entry.quantity]} per unit of sample"
    words = [
        f"{name} {typed[key]}"
        for key, name in (("sensitivity", ""), ("full_scale", "full scale"), ("scale", "scale"))
        if key in typed
    ]
    return f"{said} ({', '.join(word.strip() for word in words)})" if words else said


def _place(entry: RecordingEntry, units: str) -> str:
    return "not stated" if entry.at_m is None else show(entry.at_m, "length", units, 3)


def taps(found: Results) -> Section:
    """Every tap, used or refused with its reason."""
    work = found.work
    blocks: list[Block] = []
    for reading in work.taps:
        rows = tuple(
            (str(i), f"{tap.at_s:.3f}", f"{tap.peak:.3g}", tables.tap_verdict(tap))
            for i, tap in enumerate(reading.search.taps, start=1)
        )
        used = sum(tap.usable for tap in reading.search.taps)
        title = f"{reading.file}: {len(rows)} taps, {used} used"
        if rows:
            blocks.append(Table(title, ("tap", "at s", "peak, of the samples", "verdict"), rows))
        else:
            blocks.append(Paragraph(f"{reading.file}: no tap was found in it."))
        blocks += bullets(sentence(note) for note in reading.notes)
    blocks += paragraphs(work.refusals("tap"))
    return section("Taps used and refused", blocks or [Paragraph(NO_TAP)])


def modes(found: Results) -> Section:
    """Natural frequencies and damping with their doubts, and the peaks that are none."""
    evidence = found.work.evidence
    blocks: list[Block] = []
    if evidence.modes:
        title = "Natural frequencies and damping ratios, ± one standard deviation"
        blocks.append(table(title, tables.modes_cells(evidence.modes)))
    else:
        blocks += paragraphs(found.work.refusals("tap")) or [Paragraph(NO_TAP)]
    blocks.append(Paragraph(HOW_MODES))
    if evidence.tones:
        blocks.append(Paragraph(sentence(tables.tones_words(evidence))))
    if evidence.refused:
        blocks.append(Heading("Not accepted as modes"))
        blocks += bullets(sentence(text) for text in tables.refused_words(evidence.refused))
    for response in found.responses:
        blocks += _response(found, response)
    blocks += bullets(sentence(text) for text in evidence.warnings)
    return section("Measured modes", blocks)


HOW_MODES = (
    "Poles shared by all usable taps of one direction are fitted to the transforms of the free "
    "decays by maximum likelihood, weighted by the background; the standard deviation holds what "
    "the data allow and the scatter between taps. Frequencies are undamped natural frequencies. To "
    "check by hand: read the peak off the spectrum, and the damping off the straight line of the "
    "decay, zeta = ln(a1/a2) / (2 pi f (t2 - t1))."
)


def _response(found: Results, response: ResponseReading) -> list[Block]:
    units, up_to_hz = found.work.job.units, found.work.job.goal.up_to_hz
    notes = [sentence(text) for text in response_notes(response, up_to_hz)]
    if response.response is None:
        return [Heading(f"Frequency response of {response.file}"), *bullets(notes)]
    cells = responses.mode_cells(response, units)
    shown: list[Block] = [table(responses.headline(response), cells)] if cells else []
    return [*shown, *bullets(notes)]


def spectra(found: Results, bands: tuple[Band, ...]) -> Section:
    """One figure for each tap recording."""
    work = found.work
    figures: list[Figure] = []
    for number, reading in enumerate(work.taps, start=1):
        drawing = tap_figure(reading, _marks(found, reading, bands), work.job.goal.up_to_hz, number)
        figures += [drawing] if drawing else []
    if not figures:
        return section("Spectra and decays of the taps", [Paragraph(NO_TAP)])
    return section("Spectra and decays of the taps", figures)


def _marks(found: Results, reading: TapReading, bands: tuple[Band, ...]) -> Marks:
    entry, evidence = reading.entry, found.work.evidence
    seen = tuple(
        mode
        for mode in evidence.firm
        if mode.taps and mode.direction == entry.direction and mode.state == entry.state
    )
    return Marks(seen, evidence.tones, bands)
