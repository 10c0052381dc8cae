"""One estimate held against the truth of its recording."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.modes import MeasuredMode
from fieldkit.signal.taps import Tap
from tests.bench.accuracy.bound import ModeBound
from tests.bench.accuracy.estimating import LOW_HZ, Estimated
from tests.bench.accuracy.peak_picking import Peak
from tests.bench.accuracy.recordings import Simulated, TrueBlow, TrueMode

Real = NDArray[np.float64]

LEAST_ENERGY_DB = 25.0
LEAST_SEPARATION_SDS = 10.0
_REACH_SDS = 5.0
_MOST_BANDWIDTHS = 2.0
_TAP_WITHIN_S = 0.06
_MAINS_WITHIN_HZ = 0.25


@dataclass(frozen=True)
class FoundMode:
    """An estimable mode that was found."""

    true: TrueMode
    bound: ModeBound
    frequency_error_hz: float
    frequency_sd_hz: float
    damping_log_error: float
    """ln(estimate / truth)."""
    damping_log_sd: float
    picked: Peak | None
    """What peak picking says about it."""

    @property
    def frequency_score(self) -> float:
        return self.frequency_error_hz / self.frequency_sd_hz

    @property
    def damping_score(self) -> float:
        return self.damping_log_error / self.damping_log_sd

    @property
    def frequency_ratio(self) -> float:
        """Error over the bound."""
        return self.frequency_error_hz / self.bound.frequency_sd_hz

    @property
    def damping_ratio(self) -> float:
        """Error over the bound."""
        relative = self.bound.damping_sd / self.true.damping_ratio
        return self.damping_log_error / relative


@dataclass(frozen=True)
class Score:
    """How one recording went."""

    estimable: int
    found: tuple[FoundMode, ...]
    missed_hz: tuple[float, ...]
    false_hz: tuple[float, ...]
    false_at_mains_hz: tuple[float, ...]
    doubles: int = 0
    doubles_told: int = 0
    clipped: int = 0
    clipped_told: int = 0
    good_taps: int = 0
    good_taps_used: int = 0
    picked: int = 0
    """Estimable modes that peak picking has within half a bandwidth."""
    cpu_s: float = 0.0
    crash: str = ""


def scored(
    made: Simulated,
    bounds: Sequence[ModeBound],
    said: Estimated,
    peaks: Sequence[Peak],
) -> Score:
    """Everything that is counted about one recording."""
    estimate, taps = said.estimate, said.taps
    pairs = matched(made.modes, bounds, estimate.modes)
    able = estimable(made, bounds)
    picks = {j: nearest_peak(made.modes[j], peaks) for j in able}
    extra = unmatched(made.modes, bounds, estimate.modes, pairs)
    mains = [f for f in extra if at_mains(f, made.mains_hz)]
    found = [
        found_mode(made.modes[j], bounds[j], estimate.modes[pairs[j]], picks[j])
        for j in able
        if j in pairs
    ]
    return Score(
        estimable=len(able),
        found=tuple(found),
        missed_hz=tuple(made.modes[j].frequency_hz for j in able if j not in pairs),
        false_hz=tuple(extra),
        false_at_mains_hz=tuple(mains),
        **(tap_counts(made.blows, taps) if made.modes and taps is not None else {}),
        picked=sum(p is not None for p in picks.values()),
        cpu_s=said.cpu_s,
        crash=said.crash,
    )


def estimable(made: Simulated, bounds: Sequence[ModeBound]) -> list[int]:
    """Modes with energy enough over the noise, far enough from the next for the bound to tell."""
    if not made.usable:
        return []
    out = []
    for j, (mode, bound) in enumerate(zip(made.modes, bounds, strict=True)):
        others = [m for m in made.modes if m is not mode]
        gap_hz = min((abs(m.frequency_hz - mode.frequency_hz) for m in others), default=np.inf)
        clear = gap_hz >= LEAST_SEPARATION_SDS * bound.frequency_sd_hz
        inside = LOW_HZ <= mode.frequency_hz <= made.high_hz
        if bound.energy_db >= LEAST_ENERGY_DB and clear and inside:
            out.append(j)
    return out


def reach_hz(true: TrueMode, bound: ModeBound, mode: MeasuredMode) -> float:
    """How far an estimate may lie from a mode and still be of it."""
    stated = min(_REACH_SDS * mode.frequency_sd_hz, _MOST_BANDWIDTHS * true.bandwidth_hz)
    known = min(_REACH_SDS * bound.frequency_sd_hz, _MOST_BANDWIDTHS * true.bandwidth_hz)
    return max(stated, known, true.bandwidth_hz / 2)


def matched(
    true: Sequence[TrueMode], bounds: Sequence[ModeBound], modes: Sequence[MeasuredMode]
) -> dict[int, int]:
    """True mode to measured mode, nearest together, each at most once."""
    from scipy.optimize import linear_sum_assignment

    if not true or not modes:
        return {}
    gap = np.array([[abs(m.frequency_hz - t.frequency_hz) for m in modes] for t in true])
    reach = np.array(
        [[reach_hz(t, b, m) for m in modes] for t, b in zip(true, bounds, strict=True)]
    )
    cost = np.where(gap <= reach, gap / reach, 1e3)
    rows, columns = linear_sum_assignment(cost)
    return {int(i): int(k) for i, k in zip(rows, columns, strict=True) if cost[i, k] <= 1}


def unmatched(
    true: Sequence[TrueMode],
    bounds: Sequence[ModeBound],
    modes: Sequence[MeasuredMode],
    pairs: dict[int, int],
) -> list[float]:
    """Frequencies of measured modes that are of no true one, nor of an unresolved group."""
    taken = set(pairs.values())
    return [
        mode.frequency_hz
        for k, mode in enumerate(modes)
        if k not in taken and not stands_for_group(mode, true, bounds, pairs)
    ]


def stands_for_group(
    mode: MeasuredMode,
    true: Sequence[TrueMode],
    bounds: Sequence[ModeBound],
    pairs: dict[int, int],
) -> bool:
    """Between two modes the bound cannot tell apart, not both found otherwise."""
    for j, (one, bound) in enumerate(zip(true, bounds, strict=True)):
        for i, other in enumerate(true):
            low, high = sorted((one.frequency_hz, other.frequency_hz))
            unresolved = high - low < LEAST_SEPARATION_SDS * bound.frequency_sd_hz
            if (
                i != j
                and unresolved
                and low < mode.frequency_hz < high
                and not {i, j} <= set(pairs)
            ):
                return True
    return False


def at_mains(frequency_hz: float, mains_hz: float) -> bool:
    if not mains_hz:
        return False
    order = max(round(frequency_hz / mains_hz), 1)
    return abs(frequency_hz - order * mains_hz) < _MAINS_WITHIN_HZ


def nearest_peak(mode: TrueMode, peaks: Sequence[Peak]) -> Peak | None:
    """The nearest peak, if within half a bandwidth."""
    if not peaks:
        return None
    best = min(peaks, key=lambda p: abs(p.frequency_hz - mode.frequency_hz))
    near = abs(best.frequency_hz - mode.frequency_hz) <= mode.bandwidth_hz / 2
    return best if near else None


def found_mode(
    true: TrueMode, bound: ModeBound, mode: MeasuredMode, picked: Peak | None
) -> FoundMode:
    damping, sd = mode.damping_ratio or np.nan, mode.damping_sd or np.nan
    return FoundMode(
        true,
        bound,
        mode.frequency_hz - true.frequency_hz,
        mode.frequency_sd_hz,
        float(np.log(damping / true.damping_ratio)),
        float(sd / damping),
        picked,
    )


def tap_counts(blows: Sequence[TrueBlow], taps: Sequence[Tap]) -> dict[str, int]:
    """Doubles and clipped blows told as such, and good ones used."""
    near = [nearest_tap(blow, taps) for blow in blows]
    both = list(zip(blows, near, strict=True))
    doubles = [(b, t) for b, t in both if b.double and not b.clipped]
    clipped = [(b, t) for b, t in both if b.clipped]
    good = [(b, t) for b, t in both if b.usable]
    return {
        "doubles": len(doubles),
        "doubles_told": sum(t is not None and says(t, "struck twice") for _, t in doubles),
        "clipped": len(clipped),
        "clipped_told": sum(t is not None and says(t, "clipped") for _, t in clipped),
        "good_taps": len(good),
        "good_taps_used": sum(t is not None and t.usable for _, t in good),
    }


def nearest_tap(blow: TrueBlow, taps: Sequence[Tap]) -> Tap | None:
    near = [tap for tap in taps if abs(tap.at_s - blow.at_s) < _TAP_WITHIN_S]
    return min(near, key=lambda tap: abs(tap.at_s - blow.at_s), default=None)


def says(tap: Tap, word: str) -> bool:
    return any(reason.startswith(word) for reason in tap.reasons)
