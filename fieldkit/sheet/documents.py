"""A workup as JSON documents, as the command line prints them: SI, the unit in every key."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from fieldkit.detune.evidence import Evidence
from fieldkit.detune.matched import Match, Pair, ParameterReading
from fieldkit.detune.verdict import Detuning, JudgedMode, OtherCure, Verdict
from fieldkit.job.document import Job
from fieldkit.signal.modes import MeasuredMode, RefusedMode
from fieldkit.signal.taps import Tap
from fieldkit.span.static import WeightAnswer
from fieldkit.workup import RunningReading, StateModes, TapReading, excitation_of

Document = dict[str, Any]


def peaks(
    readings: Sequence[TapReading],
    evidence: Evidence,
    responses: Sequence[Document | None] = (),
) -> Document:
    """Recordings with their taps, and the modes and tones found in them.

    ``responses`` has one document for each reading, None for those without a hammer.
    """
    told = list(responses) or [None] * len(readings)
    return {
        "recordings": [
            _tap_recording(reading) | ({"response": response} if response else {})
            for reading, response in zip(readings, told, strict=True)
        ],
        "modes": [_measured(mode) for mode in evidence.modes],
        "tones": [
            {"frequency_hz": tone.frequency_hz, "strength": tone.strength}
            for tone in evidence.tones
        ],
        "refused_modes": [_refused_mode(peak) for peak in evidence.refused],
        "warnings": list(dict.fromkeys([*evidence.warnings, *_notes(readings)])),
    }


def running(readings: Sequence[RunningReading], job: Job | None) -> Document:
    """Recordings with level, lines and the order each sits on, and the modes of all of them."""
    found = [reading.modes for reading in readings if reading.modes]
    modes = sorted((m for f in found for m in f.modes), key=lambda mode: mode.frequency_hz)
    lost = sorted((r for f in found for r in f.refused), key=lambda peak: peak.frequency_hz)
    return {
        "recordings": [_running_recording(reading, job) for reading in readings],
        "modes": [_measured(mode) for mode in modes],
        "refused_modes": [_refused_mode(peak) for peak in lost],
        "warnings": [
            *(f"{r.file}: {text}" for r in readings for text in r.picture.warnings),
            *(f"{r.file}: {text}" for r in readings if r.modes for text in r.modes.warnings),
            *_notes(readings),
        ],
    }


def span(
    states: Sequence[StateModes], weights: Mapping[str, WeightAnswer], warnings: Sequence[str]
) -> Document:
    """Computed modes, handbook estimate and static answer per state."""
    return {
        "states": {entry.state: _state(entry) for entry in states},
        "static": {name: _static(answer) for name, answer in weights.items()},
        "warnings": list(warnings),
    }


def match(found: Match) -> Document:
    """Measured beside computed, and what was learnt about each unknown."""
    return {
        "measured": [_measured(mode) for mode in found.measured],
        "pairs": [_pair(pair) for pair in found.pairs],
        "unpaired": [_measured(mode) for mode in found.unpaired],
        "parameters": [_parameter(parameter) for parameter in found.parameters],
        "effective_members": found.ensemble.effective_size,
        "next_measurement": found.next_measurement,
        "warnings": list(found.warnings),
    }


def detune(found: Detuning, warnings: Sequence[str] = ()) -> Document:
    """Bands, modes as they are and ranked changes."""
    return {
        "state": found.state,
        "margin": found.margin,
        "bands": [
            {
                "name": band.name,
                "low_hz": band.low_hz,
                "high_hz": band.high_hz,
                "avoid_low_hz": band.avoid_low_hz,
                "avoid_high_hz": band.avoid_high_hz,
            }
            for band in found.bands
        ],
        "modes": [_judged(mode, with_chance=True) for mode in found.modes],
        "chance_now": found.chance_now,
        "tried": found.tried,
        "fixes": [_fix(verdict) for verdict in found.fixes],
        "other_cures": [_other_cure(cure) for cure in found.other_cures],
        "warnings": [*found.warnings, *warnings],
    }


def refused(reason: str) -> Document:
    """A question that this data cannot answer."""
    return {"refused": reason}


def _tap_recording(reading: TapReading) -> Document:
    return {
        "file": reading.file,
        "rate_hz": reading.rate_hz,
        "channels": reading.channels,
        "duration_s": reading.duration_s,
        "taps": [_tap(tap) for tap in reading.search.taps],
    }


def _tap(tap: Tap) -> Document:
    return {
        "at_s": tap.at_s,
        "peak": tap.peak,
        "usable": tap.usable,
        "reasons": list(tap.reasons),
    }


def _measured(mode: MeasuredMode) -> Document:
    return {
        "frequency_hz": mode.frequency_hz,
        "frequency_sd_hz": mode.frequency_sd_hz,
        "damping_ratio": mode.damping_ratio,
        "damping_sd": mode.damping_sd,
        "direction": mode.direction,
        "state": mode.state,
        "taps": mode.taps,
        "strength": mode.strength,
        "source": mode.source,
    }


def _refused_mode(peak: RefusedMode) -> Document:
    return {"frequency_hz": peak.frequency_hz, "reason": peak.reason}


def _running_recording(reading: RunningReading, job: Job | None) -> Document:
    picture = reading.picture
    return {
        "file": reading.file,
        "rate_hz": reading.rate_hz,
        "channels": reading.channels,
        "duration_s": reading.duration_s,
        "quantity": picture.spectrum.quantity,
        "unit": picture.spectrum.unit,
        "overall": {
            "rms": picture.overall_rms,
            "velocity_rms_m_per_s": picture.velocity_rms_m_per_s,
            "low_hz": picture.low_hz,
            "high_hz": picture.high_hz,
        },
        "lines": [
            {
                "frequency_hz": line.frequency_hz,
                "rms": line.rms,
                "prominence": line.prominence,
                "steady": line.steady,
                "excitation": excitation_of(line.frequency_hz, job.excitations) if job else None,
            }
            for line in picture.lines
        ],
        "no_modes": reading.no_modes or None,
    }


def _state(entry: StateModes) -> Document:
    return {
        "modes": [
            {
                "frequency_hz": mode.frequency_hz,
                "direction": mode.direction,
                "where": f"moves most at {mode.where_m:.2f} m",
                "where_m": mode.where_m,
            }
            for mode in entry.modes
        ],
        "handbook": _handbook(entry),
    }


def _handbook(entry: StateModes) -> Document:
    if entry.handbook is None:
        return {"refused": entry.handbook_refused}
    return {
        "frequency_hz": entry.handbook.frequency_hz,
        "low_hz": entry.handbook.low_hz,
        "high_hz": entry.handbook.high_hz,
        "formula": entry.handbook.formula,
        "source": entry.handbook.source,
        "note": entry.handbook.note,
    }


def _static(answer: WeightAnswer) -> Document:
    return {
        "sag_mm": 1e3 * answer.sag_m,
        "sag_at_m": answer.sag_at_m,
        "support_loads": [
            {"index": index, "force_n": [float(component) for component in force]}
            for index, force in answer.support_loads
        ],
    }


def _pair(pair: Pair) -> Document:
    return {
        "mode": pair.mode,
        "direction": pair.direction,
        "measured_hz": pair.measured.frequency_hz,
        "measured_sd_hz": pair.measured.frequency_sd_hz,
        "model_hz": pair.model_hz,
        "low_hz": pair.low_hz,
        "high_hz": pair.high_hz,
        "before_match_hz": pair.prior_hz,
        "handbook_hz": pair.handbook_hz,
    }


def _parameter(parameter: ParameterReading) -> Document:
    return {
        "name": parameter.name,
        "median": parameter.median,
        "low": parameter.low,
        "high": parameter.high,
        "unit": parameter.unit,
        "informed": parameter.informed,
        "prior_median": parameter.prior_median,
        "prior_low": parameter.prior_low,
        "prior_high": parameter.prior_high,
    }


def _judged(mode: JudgedMode, *, with_chance: bool) -> Document:
    document: Document = {
        "median_hz": mode.median_hz,
        "low_hz": mode.low_hz,
        "high_hz": mode.high_hz,
        "direction": mode.direction,
    }
    return document | ({"chance_clear": mode.chance_clear} if with_chance else {})


def _fix(verdict: Verdict) -> Document:
    return {
        "rank": verdict.rank,
        "kind": verdict.kind,
        "summary": verdict.summary,
        "change": verdict.change.as_json(),
        "modes_after": [_judged(mode, with_chance=False) for mode in verdict.modes_after],
        "nearest": {"band": verdict.nearest.band, "separation": verdict.nearest.separation},
        "chance": verdict.chance,
        "why": verdict.why,
        "fails": verdict.fails,
        "cautions": list(verdict.cautions),
    }


def _other_cure(cure: OtherCure) -> Document:
    return {
        "kind": cure.kind,
        "summary": cure.summary,
        "change": cure.change.as_json() if cure.change else None,
        "direction": cure.direction,
        "chance": cure.chance,
        "chance_means": cure.chance_means,
        "amplification_now": cure.amplification_now,
        "amplification_after": cure.amplification_after,
        "cautions": list(cure.cautions),
    }


def _notes(readings: Sequence[TapReading] | Sequence[RunningReading]) -> list[str]:
    return [f"{reading.file}: {note}" for reading in readings for note in reading.notes]
