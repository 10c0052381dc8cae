"""Each part of a workup as lines of text: what the command line prints for people."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from fieldkit.detune.evidence import Evidence
from fieldkit.detune.matched import Match
from fieldkit.detune.verdict import Detuning, JudgedMode, OtherCure, Verdict
from fieldkit.job.document import Job
from fieldkit.quantity import show
from fieldkit.sheet.plain import clean, paragraph, percent, share, table, with_doubt
from fieldkit.signal.modes import MeasuredMode, RefusedMode
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
    lines += _modes_table(evidence.modes) or ["  none"]
    if evidence.tones:
        tones = ", ".join(f"{tone.frequency_hz:.2f} Hz" for tone in evidence.tones)
        lines += ["", *paragraph(f"Steady tones, not modes: {tones}", 0)]
    lines += _not_accepted(evidence.refused)
    return lines + warnings(evidence.warnings)


def running(readings: Sequence[RunningReading], job: Job | None) -> list[str]:
    """Level and lines of each running recording."""
    lines: list[str] = []
    for reading in readings:
        picture = reading.picture
        unit = picture.spectrum.unit
        lines += [
            f"{clean(reading.file)}: {reading.duration_s:.1f} s at {reading.rate_hz:g} Hz, "
            f"overall {picture.overall_rms:.3g} {unit} rms"
            f"{_as_velocity(picture.velocity_rms_m_per_s, job)}, {picture.low_hz:g} to "
            f"{picture.high_hz:g} Hz",
            *table(
                ("line Hz", f"rms {unit}", "over background", "steady", "sits on"),
                [
                    (
                        f"{line.frequency_hz:.2f}",
                        f"{line.rms:.3g}",
                        f"{line.prominence:.0f}x",
                        {True: "yes", False: "no", None: "?"}[line.steady],
                        (excitation_of(line.frequency_hz, job.excitations) if job else "") or "-",
                    )
                    for line in picture.lines
                ],
            ),
            *_running_modes(reading),
            *warnings((*reading.notes, *picture.warnings, *_remarks(reading))),
            "",
        ]
    return lines[:-1] if lines else ["No running recording."]


RUNNING_CAUTION = "weaker evidence than a tap: nobody knows the forces that stir them"


def _running_modes(reading: RunningReading) -> list[str]:
    """Natural frequencies in a running recording, or why there are none."""
    found = reading.modes
    if found is None or not found.modes:
        return ["", *paragraph(f"No natural frequencies from it: {reading.no_modes}", 0)]
    return [
        "",
        *paragraph(f"Natural frequencies seen running; {RUNNING_CAUTION}", 0),
        *table(
            ("Hz", "± Hz", "damping %", "± %", "strength"),
            [
                (
                    *with_doubt(mode.frequency_hz, mode.frequency_sd_hz),
                    *_damping(mode),
                    share(mode.strength),
                )
                for mode in found.modes
            ],
        ),
        *_not_accepted(found.refused),
    ]


def _remarks(reading: RunningReading) -> tuple[str, ...]:
    return reading.modes.warnings if reading.modes else ()


def _not_accepted(refused: Sequence[RefusedMode]) -> list[str]:
    """Peaks that are no modes, each with its reason."""
    if not refused:
        return []
    said = [f"{peak.frequency_hz:.2f} Hz: {peak.reason}" for peak in refused]
    return ["", "Not accepted as modes", *(p for t in said for p in paragraph(t, 2, "- "))]


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
        lines += table(
            ("mode", "Hz", "direction", "moves most at"),
            [
                (
                    str(i),
                    f"{mode.frequency_hz:.2f}",
                    mode.direction,
                    show(mode.where_m, "length", job.units, 3),
                )
                for i, mode in enumerate(entry.modes, start=1)
            ],
        )
        lines += _handbook(entry)
        lines += _static(job, weights.get(entry.state))
        lines += [""]
    return lines[:-1] + warnings(notes)


def match(found: Match, units: str) -> list[str]:
    """Measured beside computed, and what was learnt."""
    lines = ["Measured and computed, Hz"]
    lines += table(
        ("mode", "direction", "measured", "model", "5 to 95 %", "before match", "handbook"),
        [
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
        ],
    )
    if found.unpaired:
        lost = ", ".join(f"{mode.frequency_hz:.2f} Hz" for mode in found.unpaired)
        lines += ["", *paragraph(f"Belongs to no computed mode: {lost}", 0)]
    lines += ["", "What the tap says about the unknowns (5 to 95 %)"]
    lines += table(
        ("unknown", "usual", "now", "informed"),
        [
            (
                parameter.name,
                _interval(parameter.prior_low, parameter.prior_high, parameter.unit, units),
                _interval(parameter.low, parameter.high, parameter.unit, units),
                "yes" if parameter.informed else "no",
            )
            for parameter in found.parameters
        ],
    )
    lines += ["", *paragraph(f"Next: {found.next_measurement}.", 0)]
    return lines + warnings(found.warnings)


def _seen_running(mode: MeasuredMode) -> str:
    return " running" if mode.source == "running" else ""


def detune(found: Detuning, units: str) -> list[str]:
    """Bands, modes as they are, ranked changes."""
    lines = [f"To stay clear of, with a margin of {100 * found.margin:.0f} %, Hz"]
    lines += table(
        ("excitation", "from", "to", "avoid from", "to"),
        [
            (
                band.name,
                f"{band.low_hz:.2f}",
                f"{band.high_hz:.2f}",
                f"{band.avoid_low_hz:.2f}",
                f"{band.avoid_high_hz:.2f}",
            )
            for band in found.bands
        ],
    )
    lines += ["", f"Modes now, {found.state}, Hz", *_judged_table(found.modes)]
    lines += ["", f"Chance that every mode is clear now: {percent(found.chance_now)}", ""]
    tried = f", the best of {found.tried:,} single changes tried" if found.tried else ""
    lines += [f"Changes, best first{tried}"]
    for verdict in found.fixes:
        lines += fix(verdict)
    if found.other_cures:
        lines += ["", "Living with it: these do not clear the bands"]
        lines += [line for cure in found.other_cures for line in other_cure(cure)]
    return lines + warnings(found.warnings)


def fix(verdict: Verdict) -> list[str]:
    """One change with its chance, what it does to the modes, and its cautions."""
    modes = ", ".join(f"{mode.median_hz:.1f}" for mode in verdict.modes_after[:8])
    nearest = (
        f"nearest {verdict.nearest.band}, {100 * verdict.nearest.separation:.0f} % away"
        if verdict.nearest.band
        else "no band near"
    )
    lines = paragraph(
        f"chance {percent(verdict.chance)}: {verdict.summary}", 2, f"{verdict.rank:2d}. "
    )
    lines += paragraph(f"modes after {modes} Hz; {nearest}", 6)
    for text in (verdict.why, verdict.fails):
        lines += paragraph(text, 6) if text else []
    for caution in verdict.cautions:
        lines += paragraph(caution, 6, "- ")
    return lines


def other_cure(cure: OtherCure) -> list[str]:
    """A cure that promises something else than clear bands."""
    chance = f"chance {percent(cure.chance)} that {cure.chance_means}: " if cure.chance else ""
    lines = paragraph(f"{chance}{cure.summary}", 2, "- ")
    for caution in cure.cautions:
        lines += paragraph(caution, 6, "- ")
    return lines


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
        verdict = "usable" if tap.usable else "; ".join(tap.reasons)
        lines += paragraph(verdict, 2, f"{i:2d}  at {tap.at_s:7.3f} s  ")
    return lines + [line for note in reading.notes for line in paragraph(note, 2, "! ")]


def _modes_table(modes: Sequence[MeasuredMode]) -> list[str]:
    return (
        table(
            ("Hz", "± Hz", "damping %", "± %", "direction", "state", "taps", "strength"),
            [
                (
                    *with_doubt(mode.frequency_hz, mode.frequency_sd_hz),
                    *_damping(mode),
                    mode.direction or "unknown",
                    mode.state,
                    str(mode.taps) if mode.taps else mode.source,
                    share(mode.strength),
                )
                for mode in modes
            ],
        )
        if modes
        else []
    )


def _damping(mode: MeasuredMode) -> tuple[str, str]:
    """Damping and its doubt, per cent."""
    if mode.damping_ratio is None:
        return "-", "-"
    sd = None if mode.damping_sd is None else 100 * mode.damping_sd
    return with_doubt(100 * mode.damping_ratio, sd, most_decimals=3)


def _judged_table(modes: Sequence[JudgedMode]) -> list[str]:
    return table(
        ("median", "5 %", "95 %", "direction", "chance clear"),
        [
            (
                f"{mode.median_hz:.2f}",
                f"{mode.low_hz:.2f}",
                f"{mode.high_hz:.2f}",
                mode.direction,
                f"{percent(mode.chance_clear)}",
            )
            for mode in modes
        ],
    )


def _handbook(entry: StateModes) -> list[str]:
    found = entry.handbook
    if found is None:
        return paragraph(f"Handbook: {entry.handbook_refused}", 2)
    return [
        *paragraph(
            f"Handbook: {found.frequency_hz:.2f} Hz (from {found.low_hz:.2f} to "
            f"{found.high_hz:.2f} Hz), {found.formula}; {found.source}",
            2,
        ),
        *(paragraph(found.note, 2) if found.note else []),
    ]


def _static(job: Job, answer: WeightAnswer | None) -> list[str]:
    if answer is None:
        return []
    loads = ", ".join(
        f"{job.span.supports[index].kind} at "
        f"{show(job.span.supports[index].at_m, 'length', job.units, 3)}: {force[2] / 1e3:.3g} kN"
        for index, force in answer.support_loads
        if index < len(job.span.supports)
    )
    sag = show(answer.sag_m, "length", job.units, 2)
    at = show(answer.sag_at_m, "length", job.units, 3)
    return paragraph(
        f"Under its weight it sags {sag} at {at}; upward from the supports: {loads}", 2
    )


def _interval(low: float, high: float, unit: str, units: str) -> str:
    dimension = {"N/m": "stiffness", "N m/rad": "rotational_stiffness", "kg": "mass"}.get(unit)
    if dimension is None:
        return f"{low:.3f} to {high:.3f}"
    return f"{show(low, dimension, units, 2)} to {show(high, dimension, units, 2)}"
