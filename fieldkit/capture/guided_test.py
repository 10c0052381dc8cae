"""A guided tap test beside a session: hears every block, judges in a thread of its own."""

from __future__ import annotations

import threading
from collections.abc import Callable, Sequence
from contextlib import suppress
from dataclasses import dataclass, replace
from queue import SimpleQueue

import numpy as np
from numpy.typing import NDArray

from fieldkit.capture.blow import read_blow
from fieldkit.capture.enough import Expected
from fieldkit.capture.force import coherence_at, response_of
from fieldkit.capture.guide import Estimated, Guide, Loss
from fieldkit.capture.guide_snapshot import GuideSnapshot, snapshot_of
from fieldkit.capture.joint import read_joint
from fieldkit.capture.places import Ear, Place
from fieldkit.capture.ring import Ring
from fieldkit.capture.source import Block
from fieldkit.capture.trigger import (
    LONGEST_S,
    PRE_TRIGGER_S,
    QUIET_S,
    BlowSeen,
    RecordBroken,
    RecordDone,
    Trigger,
)
from fieldkit.errors import FieldkitError
from fieldkit.signal.modes import ModeEstimate, estimate_modes

LOWEST_HZ = 2.0
_OF_RATE = 0.4
_PUBLISH_S = 0.1
_RING_S = LONGEST_S + PRE_TRIGGER_S + QUIET_S + 1.0

Mark = Callable[[int, bool], None]
"""Gets the frame of a blow that the user sets aside (True), or takes in again (False)."""


@dataclass(frozen=True, eq=False)
class _Record:
    """A record that waits to be judged."""

    samples: NDArray[np.float32]
    """(n, channels)"""
    event: RecordDone
    ears: tuple[Ear, ...]


class GuidedTest:
    """A listener of a session; every method returns at once, ``snapshot`` says how things are."""

    def __init__(
        self,
        *,
        rate_hz: float,
        ears: Sequence[Ear],
        hammer: int | None = None,
        directions: Sequence[str] = ("vertical", "lateral"),
        up_to_hz: float = 200.0,
        expected: Sequence[Expected] = (),
        mark: Mark | None = None,
    ) -> None:
        """``ears`` are the channels that are judged, ``hammer`` the one of the force, from 0;
        ``expected`` are modes of a model."""
        self._rate_hz = rate_hz
        self._channels = [ear.channel for ear in ears]
        self._hammer = hammer
        self._expected = tuple(expected)
        self._mark = mark
        self._trigger = Trigger(rate_hz=rate_hz, channels=len(ears))
        self._width = 1 + max([*self._channels, -1 if hammer is None else hammer])
        self._ring = Ring(frames=round(_RING_S * rate_hz), channels=self._width)
        self._listen_anew = self._stopped = False
        self._frame = 0
        self._published_frame = 0
        self._lock = threading.Lock()
        up_to_hz = min(up_to_hz, _OF_RATE * rate_hz)
        self._guide = Guide(ears=tuple(ears), directions=tuple(directions), up_to_hz=up_to_hz)
        self._snapshot = snapshot_of(self._guide, 0, rate_hz, self._expected)
        self._queue: SimpleQueue[_Record | str] = SimpleQueue()
        self._thread = threading.Thread(target=self._work, name="guided test", daemon=True)
        self._thread.start()

    def feed(self, block: Block) -> None:
        """Take a block of the session."""
        if self._stopped:
            return
        samples = block.samples[:, : self._width]
        if self._listen_anew:
            self._listen_anew = False
            self._trigger.listen_anew()
        lost = block.cause or "frames went missing" if block.lost_frames != 0 else ""
        if block.within_frames:
            first = block.first_frame
            missed = Loss(first - block.within_frames, first, lost)
            self._change(lambda guide: guide.missed(missed))
            self._queue.put("")
        self._ring.feed(replace(block, samples=samples))
        events = self._trigger.feed(
            block.first_frame, samples[:, self._channels].astype(float), lost
        )
        self._frame = block.first_frame + len(samples)
        for event in events:
            self._take(event)
        due = self._frame - self._published_frame >= _PUBLISH_S * self._rate_hz
        if events or due or self._guide.phase != self._trigger.phase:
            phase, thresholds = self._trigger.phase, self._trigger.thresholds
            self._change(lambda guide: guide.heard(phase, thresholds))

    def snapshot(self) -> GuideSnapshot:
        """How things are."""
        return self._snapshot

    def set_aside(self, number: int | None = None) -> None:
        """Take a blow out of the estimate, the latest that counts where no number is given.

        It stays in the recording, marked.
        """
        self._put_aside(number, aside=True)

    def take_in(self, number: int) -> None:
        """Take a blow that was set aside in again."""
        self._put_aside(number, aside=False)

    def move_to(self, ears: Sequence[Ear], expected: Sequence[Expected] | None = None) -> None:
        """Go on at another place or in another direction, with the modes a model expects there.

        The channels stay the same.
        """
        self._expected = self._expected if expected is None else tuple(expected)
        self._change(lambda guide: guide.moved_to(tuple(ears)))
        self._queue.put("")

    def listen_anew(self) -> None:
        """Measure the background again."""
        self._listen_anew = True

    def stop(self) -> None:
        """Hear nothing more and end the thread; what was found stays."""
        self._stopped = True
        self._queue.put("stop")

    def _take(self, event: BlowSeen | RecordDone | RecordBroken) -> None:
        if isinstance(event, BlowSeen):
            self._change(lambda guide: guide.seen(event.frame))
        elif self._guide.seen_frame != event.blow:
            return
        elif isinstance(event, RecordBroken):
            self._change(lambda guide: guide.broken(event))
        else:
            self._change(lambda guide: guide.rung_out(event))
            self._queue.put(_Record(self._slice(event), event, self._guide.ears))

    def _slice(self, event: RecordDone) -> NDArray[np.float32]:
        first, samples = self._ring.latest(self._frame - event.first)
        return samples[max(event.first - first, 0) : event.end - first]

    def _put_aside(self, number: int | None, *, aside: bool) -> None:
        counted = [b.number for b in self._guide.blows if b.counts]
        number = number if number is not None else (counted[-1] if counted else None)
        found = [b for b in self._guide.blows if b.number == number]
        if not found or number is None:
            return
        wanted = number
        self._change(lambda guide: guide.with_set_aside(wanted, aside))
        if self._mark is not None:
            self._mark(found[0].frame, aside)
        self._queue.put("")

    def _change(self, step: Callable[[Guide], Guide]) -> None:
        with self._lock:
            self._guide = step(self._guide)
            self._trigger.record_s = self._guide.record_s
            self._published_frame = self._frame
            self._snapshot = snapshot_of(self._guide, self._frame, self._rate_hz, self._expected)

    def _work(self) -> None:
        warm_up(self._rate_hz)
        while (item := self._queue.get()) != "stop":
            if isinstance(item, _Record):
                self._judge(item)
            if self._queue.empty():
                self._estimate()

    def _judge(self, record: _Record) -> None:
        event = record.event
        try:
            reading = read_joint(
                record.samples,
                self._rate_hz,
                event.blow - event.first,
                record.ears,
                hammer=self._hammer,
                frame=event.blow,
                up_to_hz=self._guide.up_to_hz,
                quiet=self._guide.quiet(),
            )
        except Exception as error:
            told = f"a blow could not be read ({type(error).__name__}: {error})"
            self._change(lambda guide: guide.unreadable(event.blow, told))
            return
        self._change(lambda guide: guide.read(reading))

    def _estimate(self) -> None:
        while (place := self._guide.outdated()) is not None and self._queue.empty():
            self._estimate_at(place)

    def _estimate_at(self, place: Place) -> None:
        found = estimated(self._guide, place, self._rate_hz)
        self._change(lambda guide: guide.estimated(place, found))


def estimated(guide: Guide, place: Place, rate_hz: float) -> Estimated | None:
    """Modes and coherence of the blows that count at a place; None where there is none."""
    estimate = estimate_of(guide, place)
    if estimate is None:
        return None
    numbers = tuple(blow.number for blow in guide.counted(place))
    pairs = [
        joint.struck[i]
        for joint in (blow.joint for blow in guide.counted(place))
        if joint is not None and joint.struck
        for i in joint.at(place)
    ]
    response = response_of(pairs, rate_hz, guide.up_to_hz)
    modes = [(m.frequency_hz, m.damping_ratio or 0.0) for m in estimate.modes]
    return Estimated(place, numbers, estimate, coherence_at(response, modes) if response else ())


def estimate_of(guide: Guide, place: Place) -> ModeEstimate | None:
    """Modes of the blows that count at a place; None where there is none."""
    records = guide.records(place)
    if not records:
        return None
    try:
        found = estimate_modes(records, low_hz=LOWEST_HZ, high_hz=guide.up_to_hz)
    except FieldkitError as error:
        return ModeEstimate((), (), (), (str(error),))
    except Exception as error:
        told = f"the modes could not be estimated ({type(error).__name__}: {error})"
        return ModeEstimate((), (), (), (told,))
    modes = tuple(replace(m, direction=place.direction, at_m=place.at_m) for m in found.modes)
    return replace(found, modes=modes)


def warm_up(rate_hz: float) -> None:
    """Have what the first verdict needs imported before it is asked for."""
    time_s = np.arange(round(3.5 * rate_hz)) / rate_hz - 1.0
    noise = 1e-4 * np.random.default_rng(1).standard_normal(len(time_s))
    decay = np.exp(-5 * np.maximum(time_s, 0.0)) * np.sin(2 * np.pi * 0.02 * rate_hz * time_s)
    with suppress(Exception):
        reading = read_blow(noise + decay * (time_s >= 0), rate_hz, round(rate_hz))
        if reading.record is not None:
            estimate_modes([reading.record], high_hz=min(100.0, _OF_RATE * rate_hz))
