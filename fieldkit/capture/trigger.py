"""A streaming trigger: hears the background, is armed by it, and cuts a record out of every blow.

It listens to all channels together: a blow is seen as soon as any of them shows it, and has rung
out when none of them rings any more. Everything is decided on hops of 10 ms counted from the first
frame, so that blocks of any size give the same records, each exact to the sample.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]

HOP_S = 0.01
PRE_TRIGGER_S = 0.25
QUIET_S = 4.0
"""Before the pre-trigger, where the record before leaves as much: where less is heard, what noise
stirs passes for steady lines."""
SHORTEST_S = 2.0
LONGEST_S = 30.0
TIME_CONSTANTS = 6.0
"""Keeps the truncation error of a response below 0.5 % (Trethewey and Cafeo 1992)."""

LEAST_THRESHOLD = 4 * 2.0**-15
"""Four steps of a 16-bit converter."""
_OVER_MEDIAN = 2.5
_OVER_SPREAD = 8.0
_STEP_S = 5e-4
"""A blow moves the sensor in so short a time, what turns at 50 Hz hardly."""
_LISTEN_S = 2.0
_BACKGROUND_S = 5.0
_REFRESH_HOPS = 10
_LAST_HOPS = 50
_SETTLED_HOPS = 20
_UNSTEADY = 2.0
_NEVER_SETTLES_S = 3.0
_DIED_SPREADS = 2.0
_SPREAD_OF_MAD = 1.4826

LISTENING, ARMED, RECORDING, SETTLING = "listening", "armed", "recording", "settling"


@dataclass(frozen=True, slots=True)
class BlowSeen:
    """The threshold was passed."""

    frame: int


@dataclass(frozen=True, slots=True)
class RecordDone:
    """All of a blow is there to be read."""

    first: int
    """First frame of the record, the quiet before the blow included."""
    blow: int
    end: int
    """One past the last frame."""
    died_away: bool
    """Whether it ended because nothing rang any more."""


@dataclass(frozen=True, slots=True)
class RecordBroken:
    """Frames went missing inside a record."""

    blow: int
    frame: int
    """First frame behind the gap."""
    cause: str


Event = BlowSeen | RecordDone | RecordBroken


@dataclass(frozen=True, slots=True)
class Threshold:
    """What the background of a channel says a blow must pass, in the samples' unit."""

    level: float
    """Median of the peaks of the background's hops."""
    spread: float
    """Their standard deviation, told from the median absolute deviation."""
    size: float
    """Deviation from the mean that a blow passes."""
    step: float
    """Change within half a millisecond that a blow passes."""


def proposed_length_s(decays_per_s: Real) -> float:
    """Length of record for the slowest decay: six time constants, from 2 to 30 s."""
    slowest = float(np.min(decays_per_s, initial=np.inf))
    wanted_s = TIME_CONSTANTS / slowest if slowest > 0 else LONGEST_S
    return float(np.clip(wanted_s, SHORTEST_S, LONGEST_S))


class Trigger:
    """Some channels, from the first frame on; one thread feeds it."""

    def __init__(
        self,
        *,
        rate_hz: float,
        channels: int = 1,
        pre_trigger_s: float = PRE_TRIGGER_S,
        quiet_s: float = QUIET_S,
        least: float = LEAST_THRESHOLD,
    ) -> None:
        self.record_s = LONGEST_S
        """Longest record from the blow on; may be set at any time."""
        self.phase = LISTENING
        self.thresholds: tuple[Threshold, ...] = ()
        """Of each channel; empty until the background is known."""
        self._rate_hz = rate_hz
        self._hop = max(round(HOP_S * rate_hz), 1)
        self._reach = max(round(_STEP_S * rate_hz), 1)
        self._before = round((pre_trigger_s + quiet_s) * rate_hz)
        self._least = least
        self._channels = channels
        self._past: deque[Real] = deque(maxlen=round(_BACKGROUND_S / HOP_S))
        """Of each quiet hop (3, k): largest deviation and step, mean."""
        self._last: deque[Real] = deque(maxlen=_LAST_HOPS)
        self._waiting: Real = np.zeros((0, channels))
        self._tail: Real = np.zeros((0, channels))
        self._frame = 0
        self._earliest = 0
        self._blow = 0
        self._centre: Real = np.zeros(channels)
        self._hops = self._calm_hops = self._phase_hops = 0

    def listen_anew(self) -> None:
        """Forget the background, as where the machine was switched."""
        self._past.clear()
        self._enter(LISTENING)

    def feed(self, first_frame: int, samples: Real, lost_before: str = "") -> list[Event]:
        """Take (n,) samples in, or (n, channels).

        ``lost_before`` says why frames are missing before them.
        """
        events = list(self._cut_off(first_frame, lost_before)) if lost_before else []
        self._waiting = np.concatenate([self._waiting, samples.reshape(-1, self._channels)])
        whole = len(self._waiting) // self._hop * self._hop
        hops, self._waiting = self._waiting[:whole], self._waiting[whole:]
        for hop in hops.reshape(-1, self._hop, self._channels):
            events += self._take(hop)
        return events

    def _cut_off(self, first_frame: int, cause: str) -> Iterator[Event]:
        if self.phase == RECORDING:
            yield RecordBroken(self._blow, first_frame, cause)
        self._waiting, self._tail = np.zeros((2, 0, self._channels))
        self._frame = self._earliest = first_frame
        if self.phase in (RECORDING, ARMED):
            self._enter(SETTLING)

    def _take(self, hop: Real) -> Iterator[Event]:
        size, step = self._deviations(hop)
        largest = np.stack([size.max(axis=0), step.max(axis=0), hop.mean(axis=0)])
        self._hops += 1
        self._phase_hops += 1
        if self.phase == RECORDING:
            yield from self._go_on(largest[0])
        elif self.phase == ARMED:
            yield from self._watch(size, step, largest)
        elif self.phase == SETTLING:
            self._settle(largest)
        else:
            self._listen(largest)
        self._frame += self._hop

    def _deviations(self, hop: Real) -> tuple[Real, Real]:
        """(n, k) distances from the background's mean, and from half a millisecond before."""
        if self._hops % _REFRESH_HOPS == 0:
            means = [mean for _, _, mean in self._past] or [hop.mean(axis=0)]
            self._centre = np.median(means, axis=0)
        past = self._tail if len(self._tail) else np.repeat(hop[:1], self._reach, axis=0)
        joined = np.concatenate([past, hop])
        self._tail = joined[-self._reach :]
        return np.abs(hop - self._centre), np.abs(hop - joined[: self._hop])

    def _listen(self, largest: Real) -> None:
        self._past.append(largest)
        enough = round(_LISTEN_S / HOP_S)
        while len(self._past) > enough:
            self._past.popleft()
        if len(self._past) == enough and self._steady():
            self._refresh()
            self._enter(ARMED)

    def _steady(self) -> bool:
        peaks = np.array(self._past)[:, 0]
        usual = np.maximum(np.median(peaks, axis=0), self._least)
        return bool(np.all(np.median(peaks[-_LAST_HOPS:], axis=0) < _UNSTEADY * usual))

    def _watch(self, size: Real, step: Real, largest: Real) -> Iterator[Event]:
        sizes, steps = self._passed()
        over = np.any((size > sizes) | (step > steps), axis=1)
        if not over.any():
            self._past.append(largest)
            if self._hops % _REFRESH_HOPS == 0:
                self._refresh()
            return
        self._blow = self._frame + int(np.argmax(over))
        self._last.clear()
        self._enter(RECORDING)
        yield BlowSeen(self._blow)

    def _passed(self) -> tuple[Real, Real]:
        """(k,) deviations and (k,) steps that a blow passes."""
        sizes = np.array([threshold.size for threshold in self.thresholds])
        return sizes, np.array([threshold.step for threshold in self.thresholds])

    def _go_on(self, peak: Real) -> Iterator[Event]:
        self._last.append(peak)
        end = self._frame + self._hop
        limit = self._blow + round(self.record_s * self._rate_hz)
        died = end - self._blow >= SHORTEST_S * self._rate_hz and self._died_away()
        if end < limit and not died:
            return
        first = max(self._blow - self._before, self._earliest)
        end = min(end, max(limit, self._frame))
        self._earliest = end
        self._enter(SETTLING)
        yield RecordDone(first, self._blow, end, died)

    def _died_away(self) -> bool:
        quiet = [t.level + _DIED_SPREADS * t.spread for t in self.thresholds]
        return bool(np.all(np.median(self._last, axis=0) <= np.maximum(quiet, self._least / 2)))

    def _settle(self, largest: Real) -> None:
        if not self.thresholds:
            self._enter(LISTENING)
            return
        sizes, steps = self._passed()
        over = np.any(largest[0] > sizes) or np.any(largest[1] > steps)
        self._calm_hops = 0 if over else self._calm_hops + 1
        if self._calm_hops >= _SETTLED_HOPS:
            self._enter(ARMED)
        elif self._phase_hops > _NEVER_SETTLES_S / HOP_S:
            self.listen_anew()

    def _refresh(self) -> None:
        peaks = np.array(self._past)[:, :2]
        level = np.median(peaks, axis=0)
        spread = _SPREAD_OF_MAD * np.median(np.abs(peaks - level), axis=0)
        passed = np.maximum(_OVER_MEDIAN * level, level + _OVER_SPREAD * spread)
        sizes, steps = np.maximum(passed, self._least)
        values = np.stack([level[0], spread[0], sizes, steps], axis=1)
        self.thresholds = tuple(Threshold(*map(float, row)) for row in values)

    def _enter(self, phase: str) -> None:
        self.phase = phase
        self._phase_hops = self._calm_hops = 0
