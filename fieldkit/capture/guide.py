"""The guided tap test as a state that events change: nothing here waits, listens or draws."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from fieldkit.capture.blow import CUT_SHORT, GAP, BlowReading, Trace, Verdict
from fieldkit.capture.enough import Expected, Worth, next_place, worth
from fieldkit.capture.trigger import (
    ARMED,
    LISTENING,
    LONGEST_S,
    RECORDING,
    RecordBroken,
    RecordDone,
    Threshold,
    proposed_length_s,
)
from fieldkit.signal.modes import ModeEstimate, TapRecord
from fieldkit.signal.spectrum import Spectrum

READING = "reading"
"""A blow has rung out and is being judged."""
_TOO_LOUD = 0.5
"""Share of full scale that a blow would have to pass."""


@dataclass(frozen=True)
class Place:
    """Where the sensor sits, and which way it looks."""

    direction: str | None = None
    at_m: float | None = None

    def __str__(self) -> str:
        way = self.direction or "unknown direction"
        return way if self.at_m is None else f"{way} at {self.at_m:.2f} m"


@dataclass(frozen=True)
class Blow:
    """A blow of this test."""

    number: int
    """Counts from 1 over the whole test."""
    frame: int
    """In the count of the session."""
    place: Place
    verdict: Verdict
    reading: BlowReading | None = None
    """None where frames were missing."""
    set_aside: bool = False
    """Taken out by the user."""

    @property
    def counts(self) -> bool:
        """Whether the modes rest on it."""
        return self.verdict.usable and not self.set_aside


@dataclass(frozen=True)
class Guide:
    """Everything the test knows; every event gives a new one."""

    place: Place = field(default_factory=Place)
    directions: tuple[str, ...] = ("vertical", "lateral")
    """Those to be struck at each place."""
    up_to_hz: float = 200.0
    phase: str = LISTENING
    """``listening``, ``armed``, ``recording`` (it rings), ``reading`` or ``settling``."""
    threshold: Threshold | None = None
    seen_frame: int | None = None
    """The blow that rings now."""
    unread: int = 0
    """Records that wait to be judged."""
    blows: tuple[Blow, ...] = ()
    estimates: tuple[tuple[Place, tuple[int, ...], ModeEstimate], ...] = ()
    """By place: which blows they rest on, and the modes."""
    record_s: float = LONGEST_S
    notice: str = ""
    """What went wrong inside, as a sentence."""

    def heard(self, phase: str, threshold: Threshold | None) -> Guide:
        """The trigger is in this phase."""
        return replace(self, phase=phase, threshold=threshold)

    def seen(self, frame: int) -> Guide:
        """A blow begins."""
        return replace(self, phase=RECORDING, seen_frame=frame)

    def rung_out(self, _event: RecordDone) -> Guide:
        """Its record is complete and waits to be judged."""
        return replace(self, unread=self.unread + 1)

    def broken(self, event: RecordBroken) -> Guide:
        """Frames went missing inside a record."""
        verdict = Verdict(GAP, f"frames are missing inside it ({event.cause})")
        blow = Blow(len(self.blows) + 1, event.blow, self.place, verdict)
        return replace(self, blows=(*self.blows, blow), seen_frame=None)

    def read(self, reading: BlowReading, place: Place) -> Guide:
        """A record was judged."""
        blow = Blow(len(self.blows) + 1, reading.frame, place, reading.verdict, reading)
        record_s = self.record_s
        if reading.verdict.kind == CUT_SHORT:
            record_s = min(2 * record_s, LONGEST_S)
        seen = None if self.seen_frame == reading.frame else self.seen_frame
        return replace(
            self,
            blows=(*self.blows, blow),
            unread=max(self.unread - 1, 0),
            seen_frame=seen,
            record_s=record_s,
        )

    def unreadable(self, frame: int, why: str) -> Guide:
        """A record could not be judged."""
        seen = None if self.seen_frame == frame else self.seen_frame
        return replace(self, unread=max(self.unread - 1, 0), seen_frame=seen, notice=why)

    def estimated(
        self, place: Place, numbers: tuple[int, ...], estimate: ModeEstimate | None
    ) -> Guide:
        """Modes of the blows of a place; None where none counts any more."""
        others = tuple(known for known in self.estimates if known[0] != place)
        if estimate is None:
            return replace(self, estimates=others)
        guide = replace(self, estimates=(*others, (place, numbers, estimate)))
        decays = [
            2 * np.pi * m.frequency_hz * m.damping_ratio
            for m in estimate.modes
            if m.damping_ratio is not None
        ]
        return replace(guide, record_s=proposed_length_s(np.array(decays))) if decays else guide

    def with_set_aside(self, number: int, aside: bool) -> Guide:
        """A blow taken out by the user, or taken in again."""
        blows = tuple(
            replace(blow, set_aside=aside) if blow.number == number else blow for blow in self.blows
        )
        return replace(self, blows=blows)

    def moved_to(self, place: Place) -> Guide:
        """Sensor or hammer go elsewhere: what rings now belongs to neither place."""
        record_s = self.record_s if self.of(place) else LONGEST_S
        return replace(self, place=place, record_s=record_s, seen_frame=None)

    def of(self, place: Place) -> tuple[Blow, ...]:
        """Blows of a place."""
        return tuple(blow for blow in self.blows if blow.place == place)

    def counted(self, place: Place) -> tuple[Blow, ...]:
        """Blows of a place that count."""
        return tuple(blow for blow in self.of(place) if blow.counts)

    def records(self, place: Place) -> tuple[TapRecord, ...]:
        """Their free decays."""
        readings = (blow.reading for blow in self.counted(place))
        return tuple(r.record for r in readings if r is not None and r.record is not None)

    def quiet(self) -> BlowReading | None:
        """The reading whose background is the longest."""
        readings = [blow.reading for blow in self.blows if blow.reading is not None]
        return max(readings, key=lambda r: len(r.background), default=None)

    def estimate_of(self, place: Place) -> tuple[tuple[int, ...], ModeEstimate | None]:
        """Numbers of the blows an estimate rests on, and the estimate."""
        for known, numbers, estimate in self.estimates:
            if known == place:
                return numbers, estimate
        return (), None

    def outdated(self) -> Place | None:
        """A place whose estimate does not rest on the blows that count."""
        for place in dict.fromkeys(blow.place for blow in self.blows):
            if tuple(b.number for b in self.counted(place)) != self.estimate_of(place)[0]:
                return place
        return None

    def worth(self, place: Place) -> Worth:
        """What more blows at a place would bring."""
        numbers, estimate = self.estimate_of(place)
        modes = estimate.modes if estimate is not None else ()
        return worth(modes, len(self.counted(place)) if not numbers else len(numbers))

    def advice(self, expected: Sequence[Expected] = ()) -> str:
        """What to do next, one sentence."""
        here = self.worth(self.place)
        if here.more > 0:
            count = f"{here.more} more" if self.counted(self.place) else str(here.more)
            return f"{count} good blow{'s' if here.more > 1 else ''} wanted: {here.why}"
        for direction in self.directions:
            other = replace(self.place, direction=direction)
            if self.place.direction is not None and self.worth(other).more > 0:
                return (
                    f"{self.place.direction} is done ({here.why}): "
                    f"turn sensor and hammer to {direction}"
                )
        estimate = self.estimate_of(self.place)[1]
        modes = estimate.modes if estimate is not None else ()
        good = len(self.counted(self.place))
        where = next_place(modes, good, self.place.at_m, expected, self.up_to_hz)
        return where or f"this place has told what it can: {here.why}"

    def instruction(self) -> str:
        """What to do this moment, a few words."""
        if self.phase == LISTENING:
            return "listening to the background: keep still"
        if self.seen_frame is not None and self.phase == RECORDING:
            return "blow seen: it rings, touch nothing"
        if self.unread:
            return "judging the blow"
        if self.threshold is not None and self.threshold.size > _TOO_LOUD:
            return "too loud to tap: stop the machine, or lower the input level"
        if self.phase == ARMED:
            return "armed: strike once"
        return "wait until it is quiet"


@dataclass(frozen=True)
class GuideSnapshot:
    """Everything a screen shows of a guided test."""

    phase: str
    instruction: str
    """What to do this moment."""
    advice: str
    """What to do next, and why."""
    place: Place
    threshold: Threshold | None
    """Full scale 1; None until the background is known."""
    ringing_s: float | None
    """Since the blow that rings now."""
    record_s: float
    """Its record ends then at the latest."""
    blows: tuple[Blow, ...]
    """All of the test, the latest last."""
    estimate: ModeEstimate | None
    """Of the blows that count at this place."""
    estimated_from: int
    """How many blows that rests on."""
    worth: Worth
    estimating: bool
    """Whether a newer estimate is on its way."""
    estimates: tuple[tuple[Place, ModeEstimate], ...]
    """Of every place."""
    notice: str = ""

    @property
    def latest(self) -> Blow | None:
        """The blow judged last."""
        return self.blows[-1] if self.blows else None

    @property
    def trace(self) -> Trace | None:
        """Decay of the latest blow."""
        reading = self.latest.reading if self.latest else None
        return reading.trace if reading else None

    @property
    def spectrum(self) -> Spectrum | None:
        """Spectrum of the latest blow's decay."""
        reading = self.latest.reading if self.latest else None
        return reading.spectrum if reading else None


def snapshot_of(
    guide: Guide, frame: int, rate_hz: float, expected: Sequence[Expected] = ()
) -> GuideSnapshot:
    """What a screen shows when ``frame`` frames have been heard."""
    numbers, estimate = guide.estimate_of(guide.place)
    seen = guide.seen_frame
    ringing_s = (frame - seen) / rate_hz if seen is not None and guide.phase == RECORDING else None
    return GuideSnapshot(
        READING if guide.unread and guide.phase != RECORDING else guide.phase,
        guide.instruction(),
        guide.advice(expected),
        guide.place,
        guide.threshold,
        ringing_s,
        guide.record_s,
        guide.blows,
        estimate,
        len(numbers),
        guide.worth(guide.place),
        guide.outdated() is not None,
        tuple((place, found) for place, _, found in guide.estimates),
        guide.notice,
    )
