"""Each part of a workup as lines of text: what the command line prints for people."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from fieldkit.detune.evidence import Evidence
from fieldkit.detune.excitation import Band
from fieldkit.detune.matched import Match
from fieldkit.detune.verdict import Detuning, JudgedMode, OtherCure, Verdict
from fieldkit.job.document import Job
from fieldkit.quantity import show
from fieldkit.sheet.plain import Cells, clean, paragraph, percent, share, table, with_doubt
from fieldkit.signal.modes import MeasuredMode, RefusedMode
from fieldkit.signal.taps import Tap
from fieldkit.span.static import WeightAnswer
from fieldkit.workup import RunningReading, StateModes, TapReading, excitation_of

TAP_CAUTION = (
    "Before striking a line: ask the operator, follow the site's rules for pressurised, hot or "
    "hazardous lines and areas, keep clear of rotating parts, and use a soft hammer."
)


def peaks(readings: Sequence[TapReading], evidence: Evidence) -> list[str]:
    """Taps of each recording, then the modes and tones found."""
    lines: list[str] = []
    for reading in readings:
        lines += _tap_recording(reading)
    lines += ["", "Measured modes"]
    lines += table(*modes_cells(evidence.modes)) if evidence.modes else ["  none"]
    if evidence.tones:
        lines += ["", *paragraph(tones_words(evidence), 0)]
    lines += _not_accepted(evidence.refused)
    return lines + warnings(evidence.warnings)


def tones_words(evidence: Evidence) -> str:
    """The steady lines that are no modes."""
    tones = ", ".join(f"{tone.frequency_hz:.2f} Hz" for tone in evidence.tones)
    return f"Steady tones, not modes: {tones}"


def running(readings: Sequence[RunningReading], job: Job | None) -> list[str]:
    """Level and lines of each running recording."""
    lines: list[str] = []
    for reading in readings:
        lines += [
            clean(level_words(reading, job)),
            *table(*running_cells(reading, job)),
            *_running_modes(reading),
            *warnings(running_remarks(reading)),
            "",
        ]
    return lines[:-1] if lines else ["No running recording."]


def level_words(reading: RunningReading, job: Job | None) -> str:
    """Length and overall level of a running recording."""
    picture = reading.picture
    return (
        f"{reading.file}: {reading.duration_s:.1f} s at {reading.rate_hz:g} Hz, "
        f"overall {picture.overall_rms:.3g} {picture.spectrum.unit} rms"
        f"{_as_velocity(picture.velocity_rms_m_per_s, job)}, {picture.low_hz:g} to "
        f"{picture.high_hz:g} Hz"
    )


def running_cells(reading: RunningReading, job: Job | None) -> Cells:
    """The lines of a running recording."""
    head = (
        "line Hz", f"rms {reading.picture.spectrum.unit}", "over background", "steady", "sits on",
    )  # fmt: skip
    rows = [
        (
            f"{line.frequency_hz:.2f}",
            f"{line.rms:.3g}",
            f"{line.prominence:.0f}x",
            {True: "yes", False: "no", None: "?"}[line.steady],
            (excitation_of(line.frequency_hz, job.excitations) if job else "") or "-",
        )
        for line in reading.picture.lines
    ]
    return Cells(head, rows)


RUNNING_CAUTION = "weaker evidence than a tap: nobody knows the forces that stir them"


def _running_modes(reading: RunningReading) -> list[str]:
    """Natural frequencies in a running recording, or why there are none."""
    found = reading.modes
    if found is None or not found.modes:
        return ["", *paragraph(f"No natural frequencies from it: {reading.no_modes}", 0)]
    return [
        "",
        *paragraph(f"Natural frequencies seen running; {RUNNING_CAUTION}", 0),
        *table(*seen_running_cells(found.modes)),
        *_not_accepted(found.refused),
    ]


def seen_running_cells(modes: Sequence[MeasuredMode]) -> Cells:
    """Natural frequencies that a running recording shows."""
    rows = [
        (
            *with_doubt(mode.frequency_hz, mode.frequency_sd_hz),
            *_damping(mode),
            share(mode.strength),
        )
        for mode in modes
    ]
    return Cells(("Hz", "± Hz", "damping %", "± %", "strength"), rows)


def running_remarks(reading: RunningReading) -> tuple[str, ...]:
    """Everything to mind about a running recording."""
    of_modes = reading.modes.warnings if reading.modes else ()
    return (*reading.notes, *reading.picture.warnings, *of_modes)


def _not_accepted(refused: Sequence[RefusedMode]) -> list[str]:
    """Peaks that are no modes, each with its reason."""
    if not refused:
        return []
    said = refused_words(refused)
    return ["", "Not accepted as modes", *(p for t in said for p in paragraph(t, 2, "- "))]


def refused_words(refused: Sequence[RefusedMode]) -> list[str]:
    """Peaks that are no modes, each with its reason."""
    return [f"{peak.frequency_hz:.2f} Hz: {peak.reason}" for peak in refused]


def _as_velocity(rms_m_per_s: float | None, job: Job | None) -> str:
    units = job.units if job else "SI"
    return "" if rms_m_per_s is None else f" = {show(rms_m_per_s, 'velocity', units)} rms velocity"


def span(
    job: Job,
    states: Sequence[StateModes],
    weights: Mapping[str, WeightAnswer],
    notes: Sequence[str],
) -> list[str]:
    """Computed modes, handbook estimate and static answer, state by state."""
    lines: list[str] = []
    for entry in states:
        lines += [f"As {entry.state}, every unknown at its usual value"]
        lines += table(*computed_cells(entry, job.units))
        lines += [line for text in handbook_words(entry) for line in paragraph(text, 2)]
        answer = weights.get(entry.state)
        lines += paragraph(static_words(job, answer), 2) if answer else []
        lines += [""]
    return lines[:-1] + warnings(notes)


def computed_cells(entry: StateModes, units: str) -> Cells:
    """The computed modes of one state."""
    rows = [
        (
            str(i),
            f"{mode.frequency_hz:.2f}",
            mode.direction,
            show(mode.where_m, "length", units, 3),
        )
        for i, mode in enumerate(entry.modes, start=1)
    ]
    return Cells(("mode", "Hz", "direction", "moves most at"), rows)


def match(found: Match, units: str) -> list[str]:
    """Measured beside computed, and what was learnt."""
    lines = ["Measured and computed, Hz"]
    lines += table(*pair_cells(found))
    if found.unpaired:
        lines += ["", *paragraph(unpaired_words(found), 0)]
    lines += ["", UNKNOWNS_TITLE]
    lines += table(*parameter_cells(found, units))
    lines += ["", *paragraph(f"Next: {found.next_measurement}.", 0)]
    return lines + warnings(found.warnings)


UNKNOWNS_TITLE = "What the tap says about the unknowns (5 to 95 %)"


def pair_cells(found: Match) -> Cells:
    """Measured modes beside those computed."""
    head = ("mode", "direction", "measured", "model", "5 to 95 %", "before match", "handbook")
    rows = [
        (
            str(pair.mode),
            pair.direction,
            f"{pair.measured.frequency_hz:.2f}{_seen_running(pair.measured)}",
            f"{pair.model_hz:.2f}",
            f"{pair.low_hz:.2f} to {pair.high_hz:.2f}",
            f"{pair.prior_hz:.2f}",
            "-" if pair.handbook_hz is None else f"{pair.handbook_hz:.2f}",
        )
        for pair in found.pairs
    ]
    return Cells(head, rows)


def unpaired_words(found: Match) -> str:
    """Measured modes that no computed one explains."""
    lost = ", ".join(f"{mode.frequency_hz:.2f} Hz" for mode in found.unpaired)
    return f"Belongs to no computed mode: {lost}"


def parameter_cells(found: Match, units: str) -> Cells:
    """Every unknown before and after the match."""
    rows = [
        (
            parameter.name,
            interval(parameter.prior_low, parameter.prior_high, parameter.unit, units),
            interval(parameter.low, parameter.high, parameter.unit, units),
            "yes" if parameter.informed else "no",
        )
        for parameter in found.parameters
    ]
    return Cells(("unknown", "usual", "now", "informed"), rows)


def _seen_running(mode: MeasuredMode) -> str:
    return " running" if mode.source == "running" else ""


def detune(found: Detuning, units: str) -> list[str]:
    """Bands, modes as they are, ranked changes."""
    lines = [f"To stay clear of, with a margin of {100 * found.margin:.0f} %, Hz"]
    lines += table(*band_cells(found.bands))
    lines += ["", f"Modes now, {found.state}, Hz", *table(*judged_cells(found.modes))]
    lines += ["", f"Chance that every mode is clear now: {percent(found.chance_now)}", ""]
    tried = f", the best of {found.tried:,} single changes tried" if found.tried else ""
    lines += [f"Changes, best first{tried}"]
    for verdict in found.fixes:
        lines += fix(verdict)
    if found.other_cures:
        lines += ["", "Living with it: these do not clear the bands"]
        lines += [line for cure in found.other_cures for line in other_cure(cure)]
    return lines + warnings(found.warnings)


def band_cells(bands: Sequence[Band]) -> Cells:
    """Excitations, and what is to be kept clear around them."""
    rows = [
        (
            band.name,
            f"{band.low_hz:.2f}",
            f"{band.high_hz:.2f}",
            f"{band.avoid_low_hz:.2f}",
            f"{band.avoid_high_hz:.2f}",
        )
        for band in bands
    ]
    return Cells(("excitation", "from", "to", "avoid from", "to"), rows)


def nearest_words(verdict: Verdict) -> str:
    """How far the nearest band lies after a change."""
    if not verdict.nearest.band:
        return "no band near"
    return f"nearest {verdict.nearest.band}, {100 * verdict.nearest.separation:.0f} % away"


def fix(verdict: Verdict) -> list[str]:
    """One change with its chance, what it does to the modes, and its cautions."""
    modes = ", ".join(f"{mode.median_hz:.1f}" for mode in verdict.modes_after[:8])
    lines = paragraph(
        f"chance {percent(verdict.chance)}: {verdict.summary}", 2, f"{verdict.rank:2d}. "
    )
    lines += paragraph(f"modes after {modes} Hz; {nearest_words(verdict)}", 6)
    for text in (verdict.why, verdict.fails):
        lines += paragraph(text, 6) if text else []
    for caution in verdict.cautions:
        lines += paragraph(caution, 6, "- ")
    return lines


def other_cure(cure: OtherCure) -> list[str]:
    """A cure that promises something else than clear bands."""
    lines = paragraph(other_cure_words(cure), 2, "- ")
    for caution in cure.cautions:
        lines += paragraph(caution, 6, "- ")
    return lines


def other_cure_words(cure: OtherCure) -> str:
    """What such a cure promises, in one sentence."""
    chance = f"chance {percent(cure.chance)} that {cure.chance_means}: " if cure.chance else ""
    return f"{chance}{cure.summary}"


def warnings(texts: Sequence[str]) -> list[str]:
    """Warnings as a list of their own, or nothing."""
    if not texts:
        return []
    return ["", "Mind", *(line for text in texts for line in paragraph(text, 2, "! "))]


def _tap_recording(reading: TapReading) -> list[str]:
    taps = reading.search.taps
    usable = sum(tap.usable for tap in taps)
    lines = [
        f"{clean(reading.file)}: {reading.duration_s:.1f} s at {reading.rate_hz:g} Hz, "
        f"{len(taps)} tap{'' if len(taps) == 1 else 's'}, {usable} usable"
    ]
    for i, tap in enumerate(taps, start=1):
        lines += paragraph(tap_verdict(tap), 2, f"{i:2d}  at {tap.at_s:7.3f} s  ")
    return lines + [line for note in reading.notes for line in paragraph(note, 2, "! ")]


def tap_verdict(tap: Tap) -> str:
    """Whether a tap can be used, or why not."""
    return "usable" if tap.usable else "; ".join(tap.reasons)


def modes_cells(modes: Sequence[MeasuredMode]) -> Cells:
    """Measured modes with their doubts."""
    head = ("Hz", "± Hz", "damping %", "± %", "direction", "state", "taps", "strength")
    rows = [
        (
            *with_doubt(mode.frequency_hz, mode.frequency_sd_hz),
            *_damping(mode),
            mode.direction or "unknown",
            mode.state,
            str(mode.taps) if mode.taps else mode.source,
            share(mode.strength),
        )
        for mode in modes
    ]
    return Cells(head, rows)


def _damping(mode: MeasuredMode) -> tuple[str, str]:
    """Damping and its doubt, per cent."""
    if mode.damping_ratio is None:
        return "-", "-"
    sd = None if mode.damping_sd is None else 100 * mode.damping_sd
    return with_doubt(100 * mode.damping_ratio, sd, most_decimals=3)


def judged_cells(modes: Sequence[JudgedMode]) -> Cells:
    """Modes over the ensemble, each with its chance to be clear."""
    rows = [
        (
            f"{mode.median_hz:.2f}",
            f"{mode.low_hz:.2f}",
            f"{mode.high_hz:.2f}",
            mode.direction,
            f"{percent(mode.chance_clear)}",
        )
        for mode in modes
    ]
    return Cells(("median", "5 %", "95 %", "direction", "chance clear"), rows)


def handbook_words(entry: StateModes) -> list[str]:
    """The handbook estimate with formula, numbers and source, or why there is none."""
    found = entry.handbook
    if found is None:
        return [f"Handbook: {entry.handbook_refused}"]
    return [
        f"Handbook: {found.frequency_hz:.2f} Hz (from {found.low_hz:.2f} to "
        f"{found.high_hz:.2f} Hz), {found.formula}; {found.source}",
        *([found.note] if found.note else []),
    ]


def static_words(job: Job, answer: WeightAnswer) -> str:
    """Sag and support loads."""
    loads = ", ".join(
        f"{job.span.supports[index].kind} at "
        f"{show(job.span.supports[index].at_m, 'length', job.units, 3)}: {force[2] / 1e3:.3g} kN"
        for index, force in answer.support_loads
        if index < len(job.span.supports)
    )
    sag = show(answer.sag_m, "length", job.units, 2)
    at = show(answer.sag_at_m, "length", job.units, 3)
    return f"Under its weight it sags {sag} at {at}; upward from the supports: {loads}"


def interval(low: float, high: float, unit: str, units: str) -> str:
    """Two ends of a value of an unknown, in its unit."""
    dimension = {"N/m": "stiffness", "N m/rad": "rotational_stiffness", "kg": "mass"}.get(unit)
    if dimension is None:
        return f"{low:.3f} to {high:.3f}"
    return f"{show(low, dimension, units, 2)} to {show(high, dimension, units, 2)}"
