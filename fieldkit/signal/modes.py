"""Natural frequencies and damping from the free decays after taps."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import Refusal
from fieldkit.signal.audit import free_until, odd_taps, typical_misfit
from fieldkit.signal.bending import with_drift
from fieldkit.signal.misfit import searched_beside_misfit
from fieldkit.signal.polish import Fitted, polished
from fieldkit.signal.preparation import Prepared, prepare
from fieldkit.signal.pruning import pruned
from fieldkit.signal.search import Found, overcrowded, search
from fieldkit.signal.second_blows import SecondBlow, second_blows
from fieldkit.signal.settling import with_later
from fieldkit.signal.tones import tone_components
from fieldkit.signal.traces import Component
from fieldkit.signal.verdicts import Judged, hardly_decays, judged, rings_on

_LEAST_SAMPLES = 64


WORTH_SAYING = 2e-3
"""Taps that differ by less, relative, only widen the stated uncertainty."""


@dataclass(frozen=True)
class TapRecord:
    """One usable tap cut out of a recording, ready for estimation."""

    samples: NDArray[np.float64]
    """(n,) free decay, from its start to its end."""
    rate_hz: float
    background: NDArray[np.float64]
    """(m,) samples of the same channel without any blow; may be empty."""
    source: str = ""
    before: NDArray[np.float64] = field(default_factory=lambda: np.zeros(0))
    """(p,) samples directly before the free decay, from before the blow on; may be empty."""
    since_blow_s: float = 0.0
    """From the blow to the first sample of the free decay."""

    @property
    def duration_s(self) -> float:
        """Length of the free decay."""
        return len(self.samples) / self.rate_hz

    def first(self, until_s: float) -> TapRecord:
        """Only so much of the free decay."""
        return replace(self, samples=self.samples[: int(until_s * self.rate_hz)])


@dataclass(frozen=True)
class MeasuredMode:
    """A natural frequency found in measured data, or typed in by hand."""

    frequency_hz: float
    frequency_sd_hz: float
    damping_ratio: float | None
    damping_sd: float | None
    direction: str | None = None
    """``vertical``, ``lateral``, ``axial``, ``x``, ``y``, ``z``; None where nobody said."""
    taps: int = 0
    """How many taps it was seen in; 0 for a typed one."""
    strength: float = 1.0
    """Share of the strongest mode's decay energy, 0 to 1."""
    state: str = "tapped"
    at_m: float | None = None
    """Station of the sensor."""
    source: str = "tap"
    """Where it comes from: ``tap``, ``running`` (force unknown: weaker) or ``typed``."""


@dataclass(frozen=True)
class Tone:
    """A steady line: there before the blow, or not decaying."""

    frequency_hz: float
    strength: float
    """Amplitude as a share of the strongest mode's, or of the strongest tone's without modes."""


@dataclass(frozen=True)
class RefusedMode:
    """A peak that was looked at and not accepted as a mode."""

    frequency_hz: float
    reason: str


@dataclass(frozen=True)
class ModeEstimate:
    """What the taps of one direction say."""

    modes: tuple[MeasuredMode, ...]
    tones: tuple[Tone, ...]
    refused: tuple[RefusedMode, ...] = ()
    warnings: tuple[str, ...] = ()
    struck_twice: tuple[int, ...] = ()
    """Records, counted from 0, whose decay the modes show to be struck twice."""


def estimate_modes(
    records: Sequence[TapRecord], *, low_hz: float = 2.0, high_hz: float = 200.0
) -> ModeEstimate:
    """Modes between low and high from all taps of one direction together.

    Poles are shared by the taps, amplitudes are free per tap; maximum likelihood on transform bins
    weighted by the background. Frequencies are undamped natural frequencies. Raises Refusal where
    there is no record.
    """
    used = [
        k for k, r in enumerate(records) if len(r.samples) >= _LEAST_SAMPLES and np.any(r.samples)
    ]
    if not used:
        raise Refusal(
            "no usable tap in these recordings",
            "record at least three taps with a quiet second before the first and let each ring out",
        )
    free_s, (ready, found, fitted) = fitted_while_free([records[k] for k in used], low_hz, high_hz)
    if free_s:
        records = [record.first(free_s) for record in records]
    said = [not_free_after(free_s)] if free_s else []
    odd = odd_taps(fitted, len(used))
    odd[list(found.odd)] = True
    said += [without_tap(used[i] + 1, len(records)) for i in np.flatnonzero(odd)]
    if odd.any():
        used = [k for k, left_out in zip(used, odd, strict=True) if not left_out]
        ready, found, fitted = fitted_modes([records[k] for k in used], low_hz, high_hz)
    twice = struck_twice([records[k] for k in used], used, found, ready.region.high_hz)
    whole = [k for k in used if k not in twice or twice[k].after_s < records[k].since_blow_s]
    said += [struck_again(k + 1, len(records), blow) for k, blow in twice.items()]
    if 0 < len(whole) < len(used):
        ready, found, fitted = fitted_modes([records[k] for k in whole], low_hz, high_hz)
    verdicts = judged(
        fitted,
        ready.traces,
        ready.lines,
        () if found.crowded else found.unresolved,
        quiet_before=ready.has_background,
        surplus=[ready.surplus(f.part) for f in fitted],
        crowded=found.crowded,
    )
    estimate = told(verdicts, found, ready, low_hz, high_hz)
    return replace(estimate, warnings=(*said, *estimate.warnings), struck_twice=tuple(twice))


def fitted_while_free(
    records: Sequence[TapRecord], low_hz: float, high_hz: float
) -> tuple[float | None, tuple[Prepared, Found, tuple[Fitted, ...]]]:
    """Fits of whole records, or of as much as decays freely and how long that is."""
    fits = {0.0: fitted_modes(records, low_hz, high_hz)}

    def misfit_until(until_s: float) -> float:
        fits[until_s] = fitted_modes([r.first(until_s) for r in records], low_hz, high_hz)
        return typical_misfit(fits[until_s][2], len(records))

    durations_s = [record.duration_s for record in records]
    free_s = free_until(durations_s, typical_misfit(fits[0.0][2], len(records)), misfit_until)
    return free_s, fits[free_s or 0.0]


def fitted_modes(
    records: Sequence[TapRecord], low_hz: float, high_hz: float
) -> tuple[Prepared, Found, tuple[Fitted, ...]]:
    """Search, elimination and last fits of all records together."""
    ready = prepare(records, low_hz, high_hz)
    ready, found = resolved(ready)
    if found.odd:
        return ready, found, ()
    if not ready.has_background and not found.crowded:
        ready = ready.with_noise_from(found.parts)
        ready, found = resolved(ready, found)
    if not found.crowded:
        found = with_drift(ready.traces, found, ready.region)
    found, fitted = polished(ready.traces, found, ready.region)
    if found.crowded:
        fitted = with_later(ready.traces, found.parts, fitted, ready.region)
    return ready, found, fitted


def struck_twice(
    records: Sequence[TapRecord], numbers: Sequence[int], found: Found, top_hz: float
) -> dict[int, SecondBlow]:
    """Second blows that the modes show, by the numbers of the records.

    Decays that are not quite exponential would feign them: there none is looked for.
    """
    if found.crowded:
        return {}
    blows = second_blows(records, found.parts, top_hz)
    return {k: blow for k, blow in zip(numbers, blows, strict=True) if blow}


def struck_again(number: int, count: int, blow: SecondBlow) -> str:
    """A second blow that only the modes show."""
    return (
        f"usable tap {number} of {count} was struck twice: a second blow "
        f"{1000 * blow.after_s:.0f} ms after the first; let the hammer rebound freely, or use a "
        "lighter one"
    )


def not_free_after(until_s: float) -> str:
    """Only the first part of the taps could be used."""
    return (
        f"the taps do not decay as modes do for longer than {until_s:.2f} s (struck again "
        "unnoticed, touched, or not quite exponential by nature?): only that much of each was "
        "used; wait between blows until it has died away"
    )


def without_tap(number: int, count: int) -> str:
    """A tap that was left out."""
    return (
        f"usable tap {number} of {count} was left out: it does not decay freely as the others do "
        "(struck again, or touched?)"
    )


def resolved(ready: Prepared, known: Found | None = None) -> tuple[Prepared, Found]:
    """Search, then backward elimination; with the noise they ended with."""
    tones = tone_components(ready.lines, ready.traces)
    found = search(ready.traces, known.parts if known else tones, ready.region)
    if found.crowded and overcrowded(
        with_drift(ready.traces, found, ready.region).parts, ready.traces
    ):
        heard, found = searched_beside_misfit(ready.traces, tones, ready.region)
        ready = replace(ready, traces=heard)
    return ready, found if found.odd else pruned(ready.traces, found, ready.region)


def told(
    verdicts: Sequence[Judged],
    found: Found,
    ready: Prepared,
    low_hz: float,
    high_hz: float,
) -> ModeEstimate:
    """The estimate as the user gets it."""
    inside = [v for v in verdicts if low_hz <= v.estimate.frequency_hz.value <= high_hz]
    accepted = [v for v in inside if not v.reason]
    strongest = max((float(v.energy.sum()) for v in accepted), default=0.0)
    modes = [measured(v, strongest) for v in accepted]
    still = [p for p in found.parts if p.steady]
    ringing = [p for p in still if ready.has_background and rings_on(p, ready.traces, ready.lines)]
    steady = [p for p in still if all(p is not r for r in ringing)] + [
        v.part for v in inside if v.steady
    ]
    refused = [RefusedMode(v.estimate.frequency_hz.value, v.reason) for v in inside if v.reason]
    refused += [
        RefusedMode(p.frequency_hz, hardly_decays(ready.traces))
        for p in ringing
        if low_hz <= p.frequency_hz <= high_hz
    ]
    return ModeEstimate(
        tuple(sorted(modes, key=lambda m: m.frequency_hz)),
        told_tones(steady, [v.part for v in accepted], low_hz, high_hz),
        tuple(sorted(refused, key=lambda r: r.frequency_hz)),
        tuple(warnings(accepted, ready)),
    )


def measured(verdict: Judged, strongest: float) -> MeasuredMode:
    """One accepted component as a measured mode."""
    estimate = verdict.estimate
    return MeasuredMode(
        estimate.frequency_hz.value,
        estimate.frequency_hz.sd,
        estimate.damping_ratio.value,
        estimate.damping_ratio.sd,
        taps=verdict.taps,
        strength=float(verdict.energy.sum()) / strongest,
    )


def told_tones(
    steady: Sequence[Component], modes: Sequence[Component], low_hz: float, high_hz: float
) -> tuple[Tone, ...]:
    """Tones between low and high, their amplitude as a share of the strongest mode's."""
    inside = [p for p in steady if low_hz <= p.frequency_hz <= high_hz]
    reference = [typical_amplitude(p) for p in (modes or inside)]
    tones = [Tone(p.frequency_hz, typical_amplitude(p) / max(reference)) for p in inside]
    return tuple(sorted(tones, key=lambda t: t.frequency_hz))


def typical_amplitude(part: Component) -> float:
    """Median over the taps."""
    return float(np.median(np.abs(part.amplitudes)))


def warnings(modes: Sequence[Judged], ready: Prepared) -> list[str]:
    """What the user should know about how far these modes can be trusted."""
    out = []
    if len(ready.traces) == 1:
        out.append("only one tap: nothing shows whether another blow gives the same modes")
    if not ready.has_background:
        out.append(
            "no quiet time before the blow: steady tones cannot be told from modes for sure; "
            "leave two quiet seconds before the first tap"
        )
    out += [unresolved(v) for v in modes if v.two]
    out += [drift_within(v) for v in modes if v.part.bend]
    apart = [v for v in modes if v.estimate.scattered and not v.part.bend]
    return out + [drift(v) for v in apart if spread(v) > WORTH_SAYING]


def spread(verdict: Judged) -> float:
    """Range of a mode's frequency over the taps, relative."""
    frequency_hz = verdict.estimate.tap_frequencies_hz
    return float(np.ptp(frequency_hz) / verdict.estimate.frequency_hz.value)


def unresolved(verdict: Judged) -> str:
    """A mode that may be two."""
    return (
        f"the mode at {verdict.estimate.frequency_hz.value:.4g} Hz may be two that lie nearer than "
        "half their bandwidth; tap in another direction to tell them apart"
    )


def drift_within(verdict: Judged) -> str:
    """How the frequency of one mode moves while it dies away."""
    part = verdict.part
    return (
        f"the frequency of the mode at {verdict.estimate.frequency_hz.value:.4g} Hz drifts inside "
        f"each decay, from {part.natural_hz + part.drift_hz:.2f} Hz right after the blow to "
        f"{part.natural_hz:.2f} Hz at the end, as where a support has play: its uncertainty is "
        "widened; tap softly, near the running amplitude"
    )


def drift(verdict: Judged) -> str:
    """How the taps disagree about one mode."""
    frequency_hz, peaks = verdict.estimate.tap_frequencies_hz, verdict.estimate.tap_peaks
    where = f"the taps disagree about the mode at {verdict.estimate.frequency_hz.value:.4g} Hz"
    span = f"{frequency_hz.min():.2f} to {frequency_hz.max():.2f} Hz"
    if len(peaks) < 3 or np.ptp(peaks) < 0.2 * peaks.max():
        return f"{where} ({span}): its uncertainty is widened"
    rank = float(np.corrcoef(peaks, frequency_hz)[0, 1])
    if abs(rank) < 0.8:
        return f"{where} ({span}): its uncertainty is widened"
    way = "falls" if rank < 0 else "rises"
    return (
        f"{where} ({span}): the frequency {way} with the strength of the blow, as where a support "
        "has play; tap softly, near the running amplitude"
    )
