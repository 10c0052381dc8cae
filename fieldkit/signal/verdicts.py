"""Is a fitted component a mode? If not, why, in words for the user."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.bending import stands_for
from fieldkit.signal.covariance import Estimate, PoleEstimate, pole_estimate
from fieldkit.signal.polish import Fitted
from fieldkit.signal.search import FAR_WEAKER, NEARNESS
from fieldkit.signal.settling import amid
from fieldkit.signal.tones import WANDERING_WIDTH, Line
from fieldkit.signal.traces import Component, Trace, decay_energy

Real = NDArray[np.float64]

LARGEST_DAMPING = 0.2
LARGEST_RELATIVE_SD = 0.28
_SEEN = 15.0
_WELL_EXPECTED = 60.0
_OVER_LINE = 3.0
_LINE_WANDER = 2e-3
_FAR_WANDER = 6e-3
"""Of a line that was seen to wander, or that is stronger than what stands beside it."""
_MAINS_HZ = (50.0, 60.0)
_TO_SPARE = 1.15
_HARDLY_DECAYS = 0.5
_MOST_UNSETTLED = 0.5
_SURE = 0.1
_DISTORTED = 1e-3
"""Energy of a product of distortion over that of either of the two it comes from, at most."""
_SAME_DECAY = 0.1


@dataclass(frozen=True)
class Judged:
    """A fitted component with its values and what speaks against it."""

    part: Component
    estimate: PoleEstimate
    energy: Real
    """(K,) decay energy in each tap."""
    gain: Real
    """(K,) gain in twice the log-likelihood each tap alone gives it."""
    reason: str
    """Empty for a mode."""
    steady: bool = False
    """Refused because it is a steady tone."""
    two: bool = False
    """May be two modes too near each other to be told apart."""

    @property
    def taps(self) -> int:
        """Number of taps in which it is seen."""
        return max(int(np.count_nonzero(self.gain > _SEEN)), 1)


def judged(
    fitted: Sequence[Fitted],
    traces: Sequence[Trace],
    lines: Sequence[Line],
    unresolved: Sequence[tuple[complex, complex]] = (),
    *,
    quiet_before: bool = False,
    surplus: Sequence[float] = (),
    crowded: bool = False,
) -> list[Judged]:
    """Every fitted component, judged.

    ``quiet_before``: the lines before the blow are known. ``surplus``: what the background holds at
    each component over the noise it was fitted with. ``crowded``: decays are not exactly
    exponential.
    """
    over = surplus or [1.0] * len(fitted)
    gains = [tap_gains(f, traces) / s for f, s in zip(fitted, over, strict=True)]
    strength = np.sum([decay_energy(f.part, traces) for f in fitted], axis=0)
    whole = [
        widened(pole_estimate(one, (gain > _SEEN).astype(float)), more)
        for one, gain, more in zip(fitted, gains, over, strict=True)
    ]
    plain = [amid(e, f) for e, f in zip(whole, fitted, strict=True)]
    out = []
    for one, gain, first, estimate in zip(fitted, gains, whole, plain, strict=True):
        doubtful = objection(first) or unsettled(estimate)
        twins = [pair for pair in unresolved if stands_for(one.part, pair) and not one.part.bend]
        for pair in twins:
            estimate = spanning(estimate, pair)
        estimate = drifting(estimate, one.part.drift_hz)
        steady = steadiness(one.part, estimate, traces, lines)
        ringing = bool(steady) and quiet_before and rings_on(one.part, traces, lines)
        steady = hardly_decays(traces) if ringing else steady
        energy = decay_energy(one.part, traces)
        others = [f.part for f in fitted if f is not one]
        rest = [e for f, e in zip(fitted, plain, strict=True) if f is not one]
        reason = steady or doubtful or lonely(gain, strength - energy)
        reason = reason or by_distortion(one.part, estimate, others, rest, traces)
        reason = reason or (leftover(one.part, others, traces) if crowded else "")
        out.append(
            Judged(
                one.part, estimate, energy, gain, reason, bool(steady) and not ringing, bool(twins)
            )
        )
    return out


def widened(estimate: PoleEstimate, surplus: float) -> PoleEstimate:
    """The estimate in a background of so many times the power."""
    if surplus <= 1:
        return estimate
    frequency, damping, more = estimate.frequency_hz, estimate.damping_ratio, surplus**0.5
    return replace(
        estimate,
        frequency_hz=replace(frequency, sd=more * frequency.sd),
        damping_ratio=replace(damping, sd=more * damping.sd),
    )


def by_distortion(
    part: Component,
    own: PoleEstimate,
    others: Sequence[Component],
    estimates: Sequence[PoleEstimate],
    traces: Sequence[Trace],
) -> str:
    """Why it is a product of two far stronger decays; empty where it is none.

    What squares the vibration, in the sensor or in a support, rings at sum and difference of two
    frequencies and decays as fast as both together.
    """
    energy = float(decay_energy(part, traces).sum())
    strong = [
        e
        for o, e in zip(others, estimates, strict=True)
        if not (o.steady or objection(e))
        and energy < _DISTORTED * float(decay_energy(o, traces).sum())
    ]
    at, decay = own.frequency_hz, decay_rate(own)
    for i, one in enumerate(strong):
        for other in strong[i:]:
            both = one.frequency_hz, other.frequency_hz
            total, beat = both[0].value + both[1].value, abs(both[0].value - both[1].value)
            sign = "+" if abs(total - at.value) < abs(beat - at.value) else "-"
            apart_hz = min(abs(total - at.value), abs(beat - at.value))
            first, second = decay_rate(one), decay_rate(other)
            apart_per_s = abs(first.value + second.value - decay.value)
            half_width_hz = decay.value / (2 * np.pi)
            reach_hz = min(2 * (at.sd + both[0].sd + both[1].sd), half_width_hz) + half_width_hz
            reach_per_s = 2 * (decay.sd + first.sd + second.sd) + _SAME_DECAY * decay.value
            if apart_hz < reach_hz and apart_per_s < reach_per_s:
                return (
                    f"stands at {both[0].value:.5g} {sign} {both[1].value:.5g} Hz and decays as "
                    "fast as both together: distortion of the sensor or of a support, no mode"
                )
    return ""


def decay_rate(estimate: PoleEstimate) -> Estimate:
    """Decay rate, per second."""
    omega = 2 * np.pi * estimate.frequency_hz.value
    zeta = estimate.damping_ratio
    return Estimate(zeta.value * omega, zeta.sd * omega)


def leftover(part: Component, others: Sequence[Component], traces: Sequence[Trace]) -> str:
    """Why it belongs to a far stronger mode whose decay is not exactly exponential."""
    energy = float(decay_energy(part, traces).sum())
    for other in others:
        ratio = float(decay_energy(other, traces).sum()) / max(energy, 1e-300)
        near = abs(other.frequency_hz - part.frequency_hz) < NEARNESS * other.frequency_hz
        if not other.steady and near and ratio * FAR_WEAKER > 1:
            return (
                f"stands beside the mode at {other.frequency_hz:.5g} Hz, "
                f"{10 * np.log10(ratio):.0f} dB under it: what is left of a decay that is not "
                "exactly exponential"
            )
    return ""


def spanning(estimate: PoleEstimate, pair: tuple[complex, complex]) -> PoleEstimate:
    """Uncertainties wide enough to hold both of two unresolved modes."""
    natural_hz = [abs(pole) / (2 * np.pi) for pole in pair]
    damping = [-pole.real / abs(pole) for pole in pair]
    return replace(
        estimate,
        frequency_hz=reaching(estimate.frequency_hz, natural_hz),
        damping_ratio=reaching(estimate.damping_ratio, damping),
    )


def drifting(estimate: PoleEstimate, drift_hz: float) -> PoleEstimate:
    """Amid the frequencies a mode has from its blow to the end, with an interval that holds all."""
    if drift_hz == 0:
        return estimate
    middle = estimate.frequency_hz.value + drift_hz / 2
    ends = [middle - _TO_SPARE * drift_hz / 2, middle + _TO_SPARE * drift_hz / 2]
    amid = replace(estimate.frequency_hz, value=middle)
    return replace(estimate, frequency_hz=reaching(amid, ends))


def reaching(estimate: Estimate, values: Sequence[float]) -> Estimate:
    """The estimate with a 95 % interval that reaches all values."""
    farthest = max(abs(value - estimate.value) for value in values)
    return replace(estimate, sd=float(np.hypot(estimate.sd, farthest / 1.96)))


def tap_gains(fitted: Fitted, traces: Sequence[Trace]) -> Real:
    """(K,) gain of each tap: twice the decay energy over half the one-sided noise density."""
    part = fitted.part
    at = np.array([part.frequency_hz])
    density = np.array([float(t.noise.at(at)[0]) for t in traces])
    return np.asarray(2 * decay_energy(part, traces) / (density * max(fitted.fit.variance, 0.5)))


def steadiness(
    part: Component, estimate: PoleEstimate, traces: Sequence[Trace], lines: Sequence[Line]
) -> str:
    """Why it is a steady line; empty where it is not."""
    duration_s = max(t.duration_s for t in traces)
    decays = part.decay_per_s * duration_s
    peak = float(np.abs(part.amplitudes).max())
    for line in lines:
        weaker = peak < _OVER_LINE * line.amplitude
        if beside(part, line, duration_s) and weaker and not surely_decays(decays, estimate):
            return f"a steady line at {line.frequency_hz:.2f} Hz is there before the blow"
    if decays < _HARDLY_DECAYS and near_mains(part.frequency_hz):
        return "does not decay over the record and stands at a multiple of the mains frequency"
    if decays < _HARDLY_DECAYS and estimate.damping_ratio.sd * 3 > estimate.damping_ratio.value:
        return "its damping cannot be told from none over this record: a steady line"
    return ""


def beside(part: Component, line: Line, duration_s: float) -> bool:
    """True where the line may stand at the component's frequency at another time."""
    peak = float(np.abs(part.amplitudes).max())
    reach = max(1 / duration_s, line.resolution_hz / 2, _LINE_WANDER * line.frequency_hz)
    if line.wanders or peak < line.amplitude:
        reach = max(reach, _FAR_WANDER * line.frequency_hz)
    if line.wanders:
        reach = max(reach, WANDERING_WIDTH * line.resolution_hz)
    return abs(line.frequency_hz - part.frequency_hz) < reach


def rings_on(part: Component, traces: Sequence[Trace], lines: Sequence[Line]) -> bool:
    """True for what does not decay, yet was not there before the blow and is no mains hum."""
    reach = max(_FAR_WANDER * part.frequency_hz, 1 / max(t.duration_s for t in traces))
    known = any(abs(line.frequency_hz - part.frequency_hz) < 2 * reach for line in lines)
    return not known and not near_mains(part.frequency_hz)


def hardly_decays(traces: Sequence[Trace]) -> str:
    """Why what rings on is not taken as a mode."""
    duration_s = max(t.duration_s for t in traces)
    return (
        f"rings on after the blow with hardly any decay over {duration_s:.2g} s: its damping "
        "cannot be told; record until it has died away"
    )


def surely_decays(decays: float, estimate: PoleEstimate) -> bool:
    """True where several taps agree on a decay, as no steady line makes them do."""
    zeta = estimate.damping_ratio
    agree = len(estimate.tap_frequencies_hz) > 1 and not estimate.scattered
    return decays > 1 and zeta.sd < _SURE * zeta.value and agree


def near_mains(frequency_hz: float) -> bool:
    """True at a multiple of a mains frequency."""
    return any(
        abs(frequency_hz / m - round(frequency_hz / m)) < _LINE_WANDER
        for m in _MAINS_HZ
        if frequency_hz > 0.9 * m
    )


def objection(estimate: PoleEstimate) -> str:
    """What the values themselves say against a mode."""
    zeta = estimate.damping_ratio
    if zeta.value > LARGEST_DAMPING:
        return (
            f"damping ratio {zeta.value:.2f} is above {LARGEST_DAMPING}: what the contact or the "
            "background leaves, no vibration that rings"
        )
    if zeta.value <= 0:
        return "its damping cannot be told from none: too little energy over the background"
    if zeta.sd > LARGEST_RELATIVE_SD * zeta.value:
        return (
            f"damping uncertain by {100 * zeta.sd / zeta.value:.0f} %: too little energy over the "
            "background; tap harder, or record more taps"
        )
    return ""


def unsettled(estimate: PoleEstimate) -> str:
    """What speaks against a mode whose decay changes."""
    zeta = estimate.damping_ratio
    if zeta.sd > _MOST_UNSETTLED * zeta.value:
        return "no one decay: what comes later in it tells a quite different damping"
    return ""


def lonely(gain: Real, strength: Real) -> str:
    """Why a component seen in one of several taps is not believed; empty where it is.

    ``strength`` (K,) is the energy of everything else in each tap: what a tap can be asked to show.
    """
    if len(gain) < 3 or np.count_nonzero(gain > _SEEN) != 1:
        return ""
    top = int(np.argmax(gain))
    expected = gain[top] * strength / max(float(strength[top]), 1e-300)
    missing = (expected > _WELL_EXPECTED) & (gain < _SEEN)
    if np.count_nonzero(missing) < 2:
        return ""
    return f"seen in one of {len(gain)} taps only"
