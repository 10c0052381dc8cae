"""Natural frequencies and damping from broadband running vibration, without a hammer.

Machine lines are taken out, poles that many model orders of a subspace identification agree about
are refined by the likelihood of the periodogram, and what does not hold is refused with a reason.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import InputError, Refusal
from fieldkit.signal.decimation import decimate
from fieldkit.signal.health import offset_and_drift
from fieldkit.signal.machine_lines import MachineLine, without_lines
from fieldkit.signal.modes import MeasuredMode, ModeEstimate, RefusedMode, Tone
from fieldkit.signal.running_search import Searched, search
from fieldkit.signal.running_verdicts import Judged, Record, judged
from fieldkit.signal.steady_lines import RunningLine

Real = NDArray[np.float64]

SHORTEST_S = 30.0
UNSTABLE = "not stable: too few model orders agree about it"
FAINT = "too faint: chance alone makes such a peak now and then"
_RATE_OVER_HIGHEST = 3.0
_KEPT_OVER_HIGHEST = 1.25
_LOOKED_AT_OVER_HIGHEST = 1.12
"""A mode just above the range would bend the background below it."""
_NYQUIST_SHARE = 0.45
_ROUNDING = 1e-10
"""Of the power: what is lower may be an error of arithmetic."""


def estimate_running_modes(
    signal: Real,
    rate_hz: float,
    *,
    low_hz: float = 2.0,
    high_hz: float = 200.0,
    lines: Sequence[RunningLine] = (),
) -> ModeEstimate:
    """Modes between low and high that random forces keep stirring in a record (n,).

    ``lines`` are those already seen in its spectrum; others are looked for. Frequencies are
    undamped natural frequencies; standard deviations come from the Fisher information of the
    likelihood (Whittle 1953), widened where the two halves of the record disagree. The force was
    not measured, so modes are marked ``source="running"``: weaker evidence than a tap. Raises
    InputError for an impossible range or values that are not finite, Refusal under 30 s of record
    and where there are machine lines only.
    """
    _check(signal, rate_hz, low_hz, high_hz)
    vibration, _ = offset_and_drift(signal)
    slow, slow_rate = _at_low_rate(vibration, rate_hz, high_hz)
    slow = slow / max(float(np.std(slow)), 1e-300)
    cleaned, removed = without_lines(slow, slow_rate, [line.frequency_hz for line in lines])
    _require_broadband(slow, cleaned, removed)
    record = Record.of(cleaned, slow_rate, removed)
    top_hz = min(_LOOKED_AT_OVER_HIGHEST * high_hz, _NYQUIST_SHARE * slow_rate)
    found = search(record.whole, low_hz, top_hz)
    estimate = _told(judged(found.modes, record), found, removed, low_hz, high_hz)
    if not estimate.modes and sum(line.rms**2 for line in removed) > np.mean(cleaned**2):
        raise _lines_only()
    return estimate


def _check(signal: Real, rate_hz: float, low_hz: float, high_hz: float) -> None:
    if not 0 < low_hz < high_hz <= rate_hz / 2:
        raise InputError(
            f"modes wanted from {low_hz:g} to {high_hz:g} Hz in a recording at {rate_hz:g} Hz",
            f"give a range above zero and up to {rate_hz / 2:g} Hz",
        )
    if not np.isfinite(signal).all():
        raise InputError("the recording holds samples that are not finite", "export it again")
    duration_s = len(signal) / rate_hz
    if duration_s < SHORTEST_S - 0.01:
        raise Refusal(
            f"{duration_s:.3g} s of running record are too short for natural frequencies",
            f"record at least {SHORTEST_S:g} s, better two minutes, at steady conditions",
        )
    if np.ptp(signal) == 0.0:
        raise Refusal(
            "the channel is silent", "check cable, sensor supply and input level, then record again"
        )


def _at_low_rate(signal: Real, rate_hz: float, high_hz: float) -> tuple[Real, float]:
    """The record at some three times the highest frequency, in two steps where it is far."""
    wanted, kept = _RATE_OVER_HIGHEST * high_hz, _KEPT_OVER_HIGHEST * high_hz
    if rate_hz > 8 * wanted:
        signal, rate_hz = decimate(signal, rate_hz, keep_hz=kept, wanted_rate_hz=4 * wanted)
    return decimate(signal, rate_hz, keep_hz=kept, wanted_rate_hz=wanted)


def _require_broadband(slow: Real, cleaned: Real, removed: Sequence[MachineLine]) -> None:
    if removed and np.mean(cleaned**2) < _ROUNDING * np.mean(slow**2):
        raise _lines_only()


def _lines_only() -> Refusal:
    return Refusal(
        "the record holds machine lines only, nothing broadband that would stir a mode",
        "tap the pipe, or record while flow or several machines shake it",
    )


def _told(
    verdicts: Sequence[Judged],
    found: Searched,
    removed: Sequence[MachineLine],
    low_hz: float,
    high_hz: float,
) -> ModeEstimate:
    """The estimate as the user gets it."""
    inside = [v for v in verdicts if low_hz <= v.frequency_hz.value <= high_hz]
    accepted = [v for v in inside if not v.reason]
    strongest = max((v.mean_square for v in accepted), default=1.0)
    refused = [RefusedMode(v.frequency_hz.value, v.reason) for v in inside if v.reason]
    refused += [RefusedMode(f, UNSTABLE) for f in found.unstable_hz if f <= high_hz]
    refused += [RefusedMode(f, FAINT) for f in found.faint_hz if f <= high_hz]
    lines = [line for line in removed if low_hz <= line.frequency_hz <= high_hz]
    loudest = max((line.rms for line in lines), default=1.0)
    return ModeEstimate(
        tuple(_measured(v, strongest) for v in accepted),
        tuple(Tone(line.frequency_hz, line.rms / loudest) for line in lines),
        tuple(sorted(refused, key=lambda r: r.frequency_hz)),
        tuple(unresolved(v.frequency_hz.value) for v in accepted if v.maybe_two),
    )


def unresolved(frequency_hz: float) -> str:
    """A mode that may be two."""
    return (
        f"the running mode at {frequency_hz:.4g} Hz may be two that lie within a bandwidth: its "
        "uncertainty is widened"
    )


def _measured(verdict: Judged, strongest: float) -> MeasuredMode:
    return MeasuredMode(
        verdict.frequency_hz.value,
        verdict.frequency_hz.sd,
        verdict.damping_ratio.value,
        verdict.damping_ratio.sd,
        strength=verdict.mean_square / strongest,
        source="running",
    )
