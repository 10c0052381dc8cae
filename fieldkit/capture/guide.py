"""The guided tap test as a state that events change: nothing here waits, listens or draws."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.capture.blow import BlowReading
from fieldkit.capture.enough import LEAST_BLOWS, Expected, Worth, best_here, next_place, worth
from fieldkit.capture.joint import JointReading
from fieldkit.capture.places import Ear, Place, together
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
from fieldkit.capture.verdict import CUT_SHORT, GAP, Verdict
from fieldkit.signal.modes import ModeEstimate, TapRecord

READING = "reading"
"""A blow has rung out and is being judged."""
_TOO_LOUD = 0.5
"""Share of full scale that a blow would have to pass."""
_GIVEN_UP = 6
"""Blows that count at neighbouring sensors, after which one that never rang is let be."""


@dataclass(frozen=True)
class Blow:
    """A blow of this test."""

    number: int
    """Counts from 1 over the whole test."""
    frame: int
    """In the count of the session."""
    places: tuple[Place, ...]
    """Of every sensor that was to hear it."""
    verdict: Verdict
    joint: JointReading | None = None
    """None where frames were missing."""
    set_aside: bool = False
    """Taken out by the user."""

    @property
    def counts(self) -> bool:
        """Whether the modes rest on it."""
        return self.verdict.usable and not self.set_aside

    @property
    def rang(self) -> tuple[Place, ...]:
        """Places that it was struck for."""
        return self.joint.rang if self.joint is not None else ()

    @property
    def reading(self) -> BlowReading | None:
        """Of the sensor that heard it loudest."""
        return self.joint.readings[self.joint.lead] if self.joint is not None else None


@dataclass(frozen=True)
class Estimated:
    """What the blows that count at one place say."""

    place: Place
    numbers: tuple[int, ...]
    """Of these blows."""
    estimate: ModeEstimate
    coherence: tuple[tuple[float, float], ...] = ()
    """(frequency in Hz of a mode, coherence of the response there); empty without a hammer."""


@dataclass(frozen=True)
class Loss:
    """Frames that went missing somewhere in a range of frames."""

    first: int
    last: int
    cause: str

    def spoils(self, reading: JointReading) -> Verdict | None:
        """The verdict on a blow that they may lie in; None where they do not."""
        if self.last <= reading.frame or self.first >= reading.end:
            return None
        return Verdict(GAP, f"frames may be missing inside it ({self.cause})")


@dataclass(frozen=True)
class Guide:
    """Everything the test knows; every event gives a new one."""

    ears: tuple[Ear, ...] = (Ear(0, Place()),)
    """The channels that are judged."""
    directions: tuple[str, ...] = ("vertical", "lateral")
    """Those to be struck at each place."""
    up_to_hz: float = 200.0
    phase: str = LISTENING
    """``listening``, ``armed``, ``recording`` (it rings), ``reading`` or ``settling``."""
    thresholds: tuple[Threshold, ...] = ()
    """Of each ear; empty until the background is known."""
    seen_frame: int | None = None
    """The blow that rings now."""
    unread: int = 0
    """Records that wait to be judged."""
    blows: tuple[Blow, ...] = ()
    estimates: tuple[Estimated, ...] = ()
    """Of every place."""
    losses: tuple[Loss, ...] = ()
    """Found by the clock when what they lie in may have been judged already."""
    record_s: float = LONGEST_S
    notice: str = ""
    """What went wrong inside, as a sentence."""

    @property
    def loudest(self) -> float:
        """Highest threshold of any ear, full scale 1; 0 until the background is known."""
        return max((threshold.size for threshold in self.thresholds), default=0.0)

    def heard(self, phase: str, thresholds: tuple[Threshold, ...]) -> Guide:
        """The trigger is in this phase."""
        return replace(self, phase=phase, thresholds=thresholds)

    def seen(self, frame: int) -> Guide:
        """A blow begins."""
        return replace(self, phase=RECORDING, seen_frame=frame)

    def rung_out(self, _event: RecordDone) -> Guide:
        """Its record is complete and waits to be judged."""
        return replace(self, unread=self.unread + 1)

    def broken(self, event: RecordBroken) -> Guide:
        """Frames went missing inside a record."""
        verdict = Verdict(GAP, f"frames are missing inside it ({event.cause})")
        blow = Blow(len(self.blows) + 1, event.blow, self.places, verdict)
        return replace(self, blows=(*self.blows, blow), seen_frame=None)

    def read(self, reading: JointReading) -> Guide:
        """A record was judged."""
        places = tuple(ear.place for ear in reading.ears)
        verdict = next((v for v in (one.spoils(reading) for one in self.losses) if v), None)
        blow = Blow(len(self.blows) + 1, reading.frame, places, verdict or reading.verdict, reading)
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

    def missed(self, loss: Loss) -> Guide:
        """Frames went missing somewhere before: a blow they may lie in no longer counts."""
        blows = tuple(
            replace(blow, verdict=verdict)
            if blow.joint and (verdict := loss.spoils(blow.joint))
            else blow
            for blow in self.blows
        )
        return replace(self, blows=blows, losses=(*self.losses, loss))

    def unreadable(self, frame: int, why: str) -> Guide:
        """A record could not be judged."""
        seen = None if self.seen_frame == frame else self.seen_frame
        return replace(self, unread=max(self.unread - 1, 0), seen_frame=seen, notice=why)

    def estimated(self, place: Place, found: Estimated | None) -> Guide:
        """Modes of the blows of a place; None where none counts any more."""
        others = tuple(known for known in self.estimates if known.place != place)
        if found is None:
            return replace(self, estimates=others)
        guide = replace(self, estimates=(*others, found))
        decays = [
            2 * np.pi * m.frequency_hz * m.damping_ratio
            for one in guide.here()
            for m in one.estimate.modes
            if m.damping_ratio is not None
        ]
        return replace(guide, record_s=proposed_length_s(np.array(decays))) if decays else guide

    def with_set_aside(self, number: int, aside: bool) -> Guide:
        """A blow taken out by the user, or taken in again."""
        blows = tuple(
            replace(blow, set_aside=aside) if blow.number == number else blow for blow in self.blows
        )
        return replace(self, blows=blows)

    @property
    def places(self) -> tuple[Place, ...]:
        """Where the sensors sit now."""
        return tuple(ear.place for ear in self.ears)

    def moved_to(self, ears: tuple[Ear, ...]) -> Guide:
        """Sensors or hammer go elsewhere: what rings now belongs to neither place."""
        places = tuple(ear.place for ear in ears)
        known = any(blow.places == places for blow in self.blows)
        record_s = self.record_s if known else LONGEST_S
        return replace(self, ears=ears, record_s=record_s, seen_frame=None)

    def counted(self, place: Place) -> tuple[Blow, ...]:
        """Blows that count, and whose decay at a place can be used."""
        return tuple(b for b in self.blows if b.counts and b.joint and b.joint.at(place))

    def struck_for(self, place: Place) -> int:
        """How many blows that count were struck for a place."""
        return sum(place in blow.rang for blow in self.blows if blow.counts)

    def records(self, place: Place) -> tuple[TapRecord, ...]:
        """Their free decays."""
        joints = [blow.joint for blow in self.counted(place) if blow.joint is not None]
        found = [joint.readings[i].record for joint in joints for i in joint.at(place)]
        return tuple(record for record in found if record is not None)

    def quiet(self) -> tuple[NDArray[np.float64], ...]:
        """The longest background of each ear; empty where nothing was read from these ears."""
        joints = [b.joint for b in self.blows if b.joint and b.joint.ears == self.ears]
        longest = max(joints, key=lambda j: len(j.readings[0].background), default=None)
        return tuple(r.background for r in longest.readings) if longest else ()

    def here(self) -> tuple[Estimated, ...]:
        """What is known of the places where the sensors sit now."""
        return tuple(known for known in self.estimates if known.place in self.places)

    def estimate_of(self, place: Place) -> Estimated | None:
        """What is known of a place."""
        return next((known for known in self.estimates if known.place == place), None)

    def outdated(self) -> Place | None:
        """A place whose estimate does not rest on the blows that count."""
        for place in dict.fromkeys(place for blow in self.blows for place in blow.places):
            known = self.estimate_of(place)
            if tuple(b.number for b in self.counted(place)) != (known.numbers if known else ()):
                return place
        return None

    def worth(self, place: Place) -> Worth:
        """What more blows for a place would bring."""
        known = self.estimate_of(place)
        others = [one.estimate.modes for one in self.here() if one.place != place]
        good = self._good(place, known)
        modes = best_here(known.estimate.modes, others) if known else ()
        if known and known.estimate.modes and not modes and good >= LEAST_BLOWS:
            return Worth(0, "another direction knows its modes better", None, None)
        return worth(modes, good)

    def _good(self, place: Place, known: Estimated | None) -> int:
        """Blows struck for a place, as far as its estimate rests on them."""
        if known is None:
            return self.struck_for(place)
        return sum(place in b.rang for b in self.blows if b.number in known.numbers)

    def wanted(self) -> tuple[Place, Worth]:
        """The place to strike for, and what it would bring; with nothing more to bring, the first.

        What is begun is finished first. A place that never rang, however often its neighbours did,
        is given up.
        """
        ways = [p for p in self.places if p.direction in self.directions]
        good = sum(b.counts for b in self.blows if b.places == self.places)
        asked = [p for p in ways or self.places if good < _GIVEN_UP or self.struck_for(p)]
        begun = sorted(asked or self.places[:1], key=self.struck_for, reverse=True)
        worths = [(place, self.worth(place)) for place in begun]
        return next(((p, w) for p, w in worths if w.more > 0), worths[0])

    def advice(self, expected: Sequence[Expected] = ()) -> str:
        """What to do next, one sentence."""
        place, here = self.wanted()
        if here.more > 0:
            way = f"strike {place.direction}: " if len(self.ears) > 1 and place.direction else ""
            count = f"{here.more} more" if self.struck_for(place) else str(here.more)
            return f"{way}{count} good blow{'s' if here.more > 1 else ''} wanted: {here.why}"
        if turn := self._turn(place, here):
            return turn
        known = self.estimate_of(place)
        modes = known.estimate.modes if known else ()
        where = next_place(modes, self.struck_for(place), place.at_m, expected, self.up_to_hz)
        return where or f"this place has told what it can: {here.why}"

    def _turn(self, place: Place, here: Worth) -> str:
        """The direction that no sensor looks in yet, in words; empty where there is none."""
        done = together([Place(p.direction) for p in self.places])
        for direction in self.directions:
            other = replace(place, direction=direction)
            known = place.direction is None or other in self.places
            if not known and self.worth(other).more > 0:
                return f"{done} is done ({here.why}): turn sensor and hammer to {direction}"
        return ""

    def instruction(self) -> str:
        """What to do this moment, a few words."""
        if self.phase == LISTENING:
            return "listening to the background: keep still"
        if self.seen_frame is not None and self.phase == RECORDING:
            return "blow seen: it rings, touch nothing"
        if self.unread:
            return "judging the blow"
        if self.loudest > _TOO_LOUD:
            return "too loud to tap: stop the machine, or lower the input level"
        if self.phase == ARMED:
            return "armed: strike once"
        return "wait until it is quiet"
