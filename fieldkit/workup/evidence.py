"""Measured modes of all usable taps of a job together, and those typed by hand."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from itertools import groupby

from fieldkit.detune.evidence import Evidence
from fieldkit.errors import Refusal
from fieldkit.job.document import Job
from fieldkit.progress import Progress
from fieldkit.signal.modes import MeasuredMode, ModeEstimate, Tone, estimate_modes
from fieldkit.workup.beside import SIMULATED
from fieldkit.workup.limits import LEAST_HZ, NYQUIST_SHARE, UP_TO_HZ
from fieldkit.workup.readings import RunningReading, TapReading


def evidence_from(
    readings: Sequence[TapReading], job: Job | None, progress: Progress, up_to_hz: float = UP_TO_HZ
) -> Evidence:
    """Measured modes of all usable taps, direction by direction, and the typed ones.

    Raises Refusal where there are recordings but no usable tap and nothing typed.
    """
    up_to_hz = job.goal.up_to_hz if job else up_to_hz
    typed = job.measured if job else ()
    usable = [reading for reading in readings if reading.records]
    if readings and not usable and not typed:
        raise Refusal(
            f"no usable tap in {', '.join(reading.file for reading in readings)}"
            f" ({_why_unusable(readings)})",
            "record three taps or more, each left to ring out, a quiet second before the first",
        )
    estimates: list[tuple[GroupKey, ModeEstimate]] = []
    for key, group in groupby(sorted(usable, key=_group_key), key=_group_key):
        progress.step("finding modes", 0.5 + 0.5 * len(estimates) / len(usable))
        estimates.append((key, _estimate(list(group), up_to_hz)))
    evidence = _combined(estimates, typed)
    return replace(evidence, warnings=(*simulated_in(readings), *evidence.warnings))


def simulated_in(readings: Sequence[TapReading] | Sequence[RunningReading]) -> tuple[str, ...]:
    """A warning for each recording that was computed, not measured."""
    return tuple(
        f"{reading.file}: {note}"
        for reading in readings
        for note in reading.notes
        if note.startswith(SIMULATED)
    )


def _why_unusable(readings: Sequence[TapReading]) -> str:
    reasons = [reason for r in readings for tap in r.search.taps for reason in tap.reasons]
    return "; ".join(dict.fromkeys(reasons)) or "no blow stands out of the noise"


GroupKey = tuple[str, str, float]


def _group_key(reading: TapReading) -> GroupKey:
    """Taps of one state, direction and sensor place are estimated together."""
    entry = reading.entry
    return entry.state, entry.direction or "", -1.0 if entry.at_m is None else entry.at_m


def _estimate(group: Sequence[TapReading], up_to_hz: float) -> ModeEstimate:
    records = [record for reading in group for record in reading.records]
    highest = min(NYQUIST_SHARE * record.rate_hz for record in records)
    return estimate_modes(records, low_hz=LEAST_HZ, high_hz=min(up_to_hz, highest))


def _combined(
    estimates: Sequence[tuple[GroupKey, ModeEstimate]], typed: Sequence[MeasuredMode]
) -> Evidence:
    modes = list(typed)
    for (state, direction, at_m), found in estimates:
        modes += [
            replace(
                mode,
                state=state,
                direction=direction or None,
                at_m=None if at_m < 0 else at_m,
            )
            for mode in found.modes
        ]
    return Evidence(
        modes=tuple(sorted(modes, key=lambda mode: mode.frequency_hz)),
        tones=_merged_tones([tone for _, found in estimates for tone in found.tones]),
        refused=tuple(
            sorted(
                (refused for _, found in estimates for refused in found.refused),
                key=lambda refused: refused.frequency_hz,
            )
        ),
        warnings=tuple(dict.fromkeys(w for _, found in estimates for w in found.warnings)),
    )


def with_running_modes(evidence: Evidence, readings: Sequence[RunningReading]) -> Evidence:
    """The evidence with the modes of running recordings, each marked with source and state.

    Tones, refused peaks and warnings stay those of the taps: the readings keep their own, except
    that a simulated one is named.
    """
    running = [mode for reading in readings if reading.modes for mode in reading.modes.modes]
    together = (*evidence.modes, *running)
    return replace(
        evidence,
        modes=tuple(sorted(together, key=lambda mode: mode.frequency_hz)),
        warnings=(*evidence.warnings, *simulated_in(readings)),
    )


def _merged_tones(tones: Sequence[Tone]) -> tuple[Tone, ...]:
    """Tones heard in several directions, once each, as strong as the strongest."""
    merged: list[Tone] = []
    for tone in sorted(tones, key=lambda tone: tone.frequency_hz):
        if merged and abs(tone.frequency_hz - merged[-1].frequency_hz) < 0.1:
            merged[-1] = max(merged[-1], tone, key=lambda t: t.strength)
        else:
            merged.append(tone)
    return tuple(merged)
