"""What failed, and all about one recording."""

from __future__ import annotations

from collections.abc import Iterator
from math import log10

from tests.bench.accuracy.estimating import Estimated
from tests.bench.accuracy.kinds import recording
from tests.bench.accuracy.recordings import Simulated
from tests.bench.accuracy.scoring import Score, estimable
from tests.bench.accuracy.trial import WAYS, Trial, bounds_of

_FAR_SDS = 3.3
_SLOW_S = 2.0


def failings(trial: Trial) -> Iterator[str]:
    """One line for each way in which a recording failed."""
    for way, score in trial.scores.items():
        said = list(complaints(score))
        if said:
            yield f"{trial.kind:13} {way:13} --replay {trial.seed}: {'; '.join(said)}"


def complaints(score: Score) -> Iterator[str]:
    """What is wrong with a score."""
    if score.crash:
        yield score.crash
    if score.missed_hz:
        yield f"missed {hertz(score.missed_hz)}"
    if score.false_hz:
        yield f"false {hertz(score.false_hz)}"
    if score.false_at_mains_hz:
        yield f"of these at mains {hertz(score.false_at_mains_hz)}"
    for mode in score.found:
        if abs(mode.frequency_score) > _FAR_SDS or abs(mode.damping_score) > _FAR_SDS:
            yield (
                f"{mode.true.frequency_hz:.4g} Hz off by {mode.frequency_score:.1f} sd in f and"
                f" {mode.damping_score:.1f} in damping ({mode.frequency_ratio:.1f} and"
                f" {mode.damping_ratio:.1f} bounds)"
            )
    if score.doubles_told < score.doubles:
        yield f"doubles told {score.doubles_told} of {score.doubles}"
    if score.clipped_told < score.clipped:
        yield f"clipped told {score.clipped_told} of {score.clipped}"
    if score.good_taps_used < score.good_taps:
        yield f"good taps used {score.good_taps_used} of {score.good_taps}"
    if score.cpu_s > _SLOW_S:
        yield f"{score.cpu_s:.1f} s"


def hertz(values: tuple[float, ...]) -> str:
    return ", ".join(f"{value:.4g}" for value in values) + " Hz"


def story(kind: str, seed: int) -> str:
    """Truth and estimates of one recording."""
    made = recording(kind, seed)
    lines = [f"{kind} {seed}", *truth(made)]
    for title, way in WAYS.items():
        said = way(made)
        lines += ["", f"{title} ({said.cpu_s:.2f} s)", *told(said)]
    return "\n".join(lines)


def truth(made: Simulated) -> Iterator[str]:
    """What the recording was made from."""
    bounds = bounds_of(made)
    able = estimable(made, bounds)
    duration_s = len(made.samples) / made.rate_hz
    yield f"{made.rate_hz:g} Hz, {duration_s:.1f} s, reported up to {made.high_hz:g} Hz"
    for blow in made.blows:
        words = [w for w in ("double", "clipped", "usable") if getattr(blow, w)]
        yield (
            f"  blow {blow.at_s:8.4f} s, free from {blow.start / made.rate_hz:.4f} s"
            f" for {(blow.end - blow.start) / made.rate_hz:.2f} s {' '.join(words)}"
        )
    for j, (mode, bound) in enumerate(zip(made.modes, bounds, strict=True)):
        yield (
            f"  mode {mode.frequency_hz:9.4f} Hz ± {bound.frequency_sd_hz:.2g},"
            f" damping {100 * mode.damping_ratio:.4g} % ± {100 * bound.damping_sd:.2g} %,"
            f" {bound.energy_db:.1f} dB{'' if j in able else ', not estimable'}"
        )
    for tone in made.tones:
        level = made.density.at(tone.frequency_hz)
        strength = 10 * log10(tone.amplitude**2 / float(level))
        yield (
            f"  tone {tone.frequency_hz:9.4f} Hz, {strength:.0f} dB over the noise in a second,"
            f" wander {tone.wander:.1g}"
        )


def told(said: Estimated) -> Iterator[str]:
    """What the estimator said."""
    if said.crash:
        yield f"  {said.crash}"
    for tap in said.taps or ():
        reasons = f": {'; '.join(tap.reasons)}" if tap.reasons else ""
        yield f"  tap {tap.at_s:8.4f} s, {'usable' if tap.usable else 'unusable'}{reasons}"
    for mode in said.estimate.modes:
        damping, sd = mode.damping_ratio or 0.0, mode.damping_sd or 0.0
        yield (
            f"  mode {mode.frequency_hz:9.4f} Hz ± {mode.frequency_sd_hz:.2g},"
            f" damping {100 * damping:.4g} % ± {100 * sd:.2g} %, {mode.taps} taps"
        )
    for tone in said.estimate.tones:
        yield f"  tone {tone.frequency_hz:9.4f} Hz, {tone.strength:.2g}"
    for refused in said.estimate.refused:
        yield f"  refused {refused.frequency_hz:.4f} Hz: {refused.reason}"
    for warning in said.estimate.warnings:
        yield f"  warning: {warning}"
