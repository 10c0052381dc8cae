"""Everything a screen shows of a guided tap test, at one moment."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from fieldkit.capture.blow import Trace
from fieldkit.capture.enough import Expected, Worth
from fieldkit.capture.force import ResponseState
from fieldkit.capture.guide import READING, Blow, Estimated, Guide
from fieldkit.capture.places import Ear, Place
from fieldkit.capture.trigger import RECORDING, Threshold
from fieldkit.signal.modes import MeasuredMode, ModeEstimate, RefusedMode
from fieldkit.signal.spectrum import Spectrum


@dataclass(frozen=True)
class GuideSnapshot:
    """Everything a screen shows of a guided test."""

    phase: str
    instruction: str
    """What to do this moment."""
    advice: str
    """What to do next, and why."""
    ears: tuple[Ear, ...]
    thresholds: tuple[Threshold, ...]
    """Of each ear, full scale 1; empty until the background is known."""
    ringing_s: float | None
    """Since the blow that rings now."""
    record_s: float
    """Its record ends then at the latest."""
    blows: tuple[Blow, ...]
    """All of the test, the latest last."""
    estimate: ModeEstimate | None
    """Of all channels here, each mode with the direction it was seen in."""
    estimated_from: int
    """How many blows that rests on."""
    wanted: Place
    """What to strike for."""
    worth: Worth
    """What more blows for it would bring."""
    estimating: bool
    """Whether a newer estimate is on its way."""
    estimates: tuple[tuple[Place, ModeEstimate], ...]
    """Of every place."""
    response: ResponseState | None = None
    """None without a hammer, or with fewer than two blows."""
    notice: str = ""

    @property
    def places(self) -> tuple[Place, ...]:
        """Where the sensors sit now."""
        return tuple(ear.place for ear in self.ears)

    @property
    def loudest(self) -> float:
        """Highest threshold of any ear."""
        return max((threshold.size for threshold in self.thresholds), default=0.0)

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
    wanted, worth_it = guide.wanted()
    seen = guide.seen_frame
    ringing_s = (frame - seen) / rate_hz if seen is not None and guide.phase == RECORDING else None
    return GuideSnapshot(
        phase=READING if guide.unread and guide.phase != RECORDING else guide.phase,
        instruction=guide.instruction(),
        advice=guide.advice(expected),
        ears=guide.ears,
        thresholds=guide.thresholds,
        ringing_s=ringing_s,
        record_s=guide.record_s,
        blows=guide.blows,
        estimate=all_channels(guide.here()),
        estimated_from=len({number for known in guide.here() for number in known.numbers}),
        wanted=wanted,
        worth=worth_it,
        estimating=guide.outdated() is not None,
        estimates=tuple((known.place, known.estimate) for known in guide.estimates),
        response=response_state(guide),
        notice=guide.notice,
    )


def all_channels(known: Sequence[Estimated]) -> ModeEstimate | None:
    """The modes of several channels in one list, as a job that holds them lists them."""
    if not known:
        return None
    found = [one.estimate for one in known]
    tones = {round(tone.frequency_hz, 1): tone for one in found for tone in one.tones}
    return ModeEstimate(
        modes=tuple(sorted((m for one in found for m in one.modes), key=_frequency)),
        tones=tuple(tones[key] for key in sorted(tones)),
        refused=tuple(sorted((r for one in found for r in one.refused), key=_frequency)),
        warnings=tuple(dict.fromkeys(w for one in found for w in one.warnings)),
    )


def _frequency(found: MeasuredMode | RefusedMode) -> float:
    return found.frequency_hz


def response_state(guide: Guide) -> ResponseState | None:
    """How good the response is so far; None without a hammer or with fewer than two blows."""
    forces = [
        blow.joint.force
        for blow in guide.blows
        if blow.counts and blow.places == guide.places and blow.joint and blow.joint.force
    ]
    if len(forces) < 2:
        return None
    reached = [force.reaches_hz for force in forces if force.reaches_hz is not None]
    coherence = [pair for known in guide.here() for pair in known.coherence]
    return ResponseState(len(forces), tuple(sorted(coherence)), min(reached, default=None))
