"""A guided tap test behind its screen: session, guide, spectrum and recordings together.

Every method but ``begin`` and ``finish`` returns at once.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from contextlib import suppress
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

from fieldkit.capture.guide_snapshot import GuideSnapshot
from fieldkit.capture.guided_test import GuidedTest
from fieldkit.capture.live import LivePicture, LiveSpectrum
from fieldkit.capture.practice import PracticeSource
from fieldkit.capture.session import Session
from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.snapshot import RUNNING, Snapshot
from fieldkit.errors import FieldkitError
from fieldkit.job.recorded import next_recording
from fieldkit.ui.capture.takes import Take, remove_empty
from fieldkit.ui.capture.wiring import Wiring, ears_of, hammer_of, source_of
from fieldkit.workup.expected import expected_modes

if TYPE_CHECKING:
    from fieldkit.capture.enough import Expected
    from fieldkit.capture.source import Source
    from fieldkit.job.document import Job
    from fieldkit.ui.capture.bench import Bench

DIRECTIONS = ("vertical", "lateral")
FAULTS = (
    ("double", "Double    the hammer rebounds and strikes again"),
    ("clipped", "Clipped   too hard for the input"),
    ("soft", "Soft      hardly over the noise"),
    ("gap", "Gap       the input loses frames while it rings"),
    ("machine", "Machine   switch the pump beside it on or off"),
    ("unplug", "Unplug    the input is torn out, and comes back"),
)
_KEPT_S = 5.0
_CLOSED_WITHIN_S = 15.0


@dataclass(frozen=True)
class TapLook:
    """Everything the screen shows at one moment."""

    session: Snapshot
    guide: GuideSnapshot
    picture: LivePicture | None
    channels: tuple[ChannelSetup, ...]
    heard: int = 0
    """The channel whose spectrum it is, from 0."""
    trouble: str = ""
    """Why nothing is written, one sentence."""


class TapRun:
    """From the moment the input is opened until all is on the disk."""

    def __init__(
        self,
        source: Source,
        channels: tuple[ChannelSetup, ...],
        job_path: Path,
        up_to_hz: float,
        expected: Mapping[str | None, Sequence[Expected]] | None = None,
    ) -> None:
        """``expected``: by direction, the modes of a model."""
        self._expected = expected or {}
        self._source = source
        self._job_path = job_path
        self._channels = channels
        self._takes: list[Take] = []
        self._trouble = ""
        self._machine = False
        ears = ears_of(channels)
        self.session = Session(source, keep_s=_KEPT_S)
        self._guide = GuidedTest(
            rate_hz=source.rate_hz,
            ears=ears,
            hammer=hammer_of(channels),
            directions=DIRECTIONS,
            up_to_hz=up_to_hz,
            expected=self._expected.get(ears[0].place.direction, ()),
            mark=self.session.set_aside,
        )
        self._live = {
            ear.channel: LiveSpectrum(
                rate_hz=source.rate_hz,
                channel=ear.channel,
                top_hz=up_to_hz,
                quantity=channels[ear.channel].quantity,
                scale=channels[ear.channel].si_per_unit,
            )
            for ear in ears
        }
        self.session.add(self._guide)
        for live in self._live.values():
            self.session.add(live)
        self.session.start()

    @classmethod
    def begin(cls, job: Job, job_path: Path, wiring: Wiring, bench: Bench) -> TapRun:
        """Make the source and open it; may take seconds. Raises InputError or Refusal."""
        source, channels = source_of(job, wiring, bench), wiring.channels(job)
        expected: dict[str | None, tuple[Expected, ...]] = {}
        with suppress(FieldkitError):
            expected = {way: expected_modes(job, way) for way in (*DIRECTIONS, "axial")}
        return cls(source, channels, job_path, job.goal.up_to_hz, expected)

    @property
    def practice(self) -> bool:
        """Whether there is a rig to strike."""
        return isinstance(self._source, PracticeSource)

    def look(self) -> TapLook:
        """How things are; begins to record as soon as the input delivers."""
        shot = self.session.snapshot()
        if shot.state == RUNNING and not self._takes and not self._trouble:
            self._record(_KEPT_S)
        guide = self._guide.snapshot()
        heard = next(ear.channel for ear in guide.ears if ear.place == guide.wanted)
        return TapLook(shot, guide, self._live[heard].picture, self._channels, heard, self._trouble)

    def strike(self, fault: str = "", strength: float = 1.0) -> bool:
        """Strike the practice rig as it is asked for, or do one of FAULTS to it; False where there
        is none."""
        rig = self._source
        if not isinstance(rig, PracticeSource):
            return False
        if fault == "unplug":
            rig.unplug()
        elif fault == "machine":
            rig.machine(on=not self._machine)
            self._machine = not self._machine
        else:
            rig.tap(strength, fault=fault, direction=self._guide.snapshot().wanted.direction)
        return True

    def undo(self) -> int | None:
        """Set the latest blow aside that counts; its number, None where there is none."""
        counting = [blow.number for blow in self._guide.snapshot().blows if blow.counts]
        if not counting:
            return None
        self._guide.set_aside(counting[-1])
        return counting[-1]

    def redo(self) -> int | None:
        """Take the latest blow in again that was set aside; its number, None where there is
        none."""
        aside = [blow.number for blow in self._guide.snapshot().blows if blow.set_aside]
        if not aside:
            return None
        self._guide.take_in(aside[-1])
        return aside[-1]

    def listen_anew(self) -> None:
        """Measure the background again."""
        self._guide.listen_anew()

    def hands_on(self) -> None:
        """Miss what comes while the sensor is moved."""
        self.session.pause()

    def hands_off(self) -> None:
        """Go on."""
        self.session.resume()

    @property
    def channels(self) -> tuple[ChannelSetup, ...]:
        """As they are wired and placed now."""
        return self._channels

    def move_to(self, channels: tuple[ChannelSetup, ...]) -> None:
        """Go on with the sensors elsewhere, in a recording of its own."""
        self._channels = channels
        ears = ears_of(channels)
        rig = self._source
        if isinstance(rig, PracticeSource):
            sensors = list(rig.sensors)
            for ear in ears:
                before = sensors[ear.channel]
                sensors[ear.channel] = replace(
                    before,
                    at_m=before.at_m if ear.place.at_m is None else ear.place.at_m,
                    direction=ear.place.direction or before.direction,
                )
            rig.move(sensors, rig.struck_m)
        self._record(0.0)
        self._guide.move_to(ears, self._expected.get(ears[0].place.direction, ()))
        self._guide.listen_anew()

    def stop(self) -> None:
        """End session and guide."""
        self.session.stop()
        self._guide.stop()

    def finish(self) -> tuple[Take, ...]:
        """Stop, and wait until all is on the disk; may take seconds."""
        self.session.stop()
        written = self.session.join(_CLOSED_WITHIN_S)
        self._guide.stop()
        if not written:
            self._trouble = "the disk or the input does not answer: look at the file before use"
        takes = self._counted()
        for take in takes:
            if self.practice and not take.usable:
                remove_empty(take.path)
        return takes

    @property
    def trouble(self) -> str:
        """What ended it early, or keeps it from the disk."""
        shot = self.session.snapshot()
        failure = shot.recording.failure if shot.recording else ""
        return self._trouble or failure or (shot.message if shot.failed else "")

    def _record(self, before_s: float) -> None:
        path = next_recording(self._job_path, "tap")
        first = self.session.snapshot().frames if self._takes else 0
        try:
            self.session.record(path, self._channels, before_s=before_s)
        except FieldkitError as error:
            self._trouble = str(error)
        else:
            self._takes.append(Take(path, self._channels, "tap", first))

    def _counted(self) -> tuple[Take, ...]:
        """Every take with the number of its blows that count."""
        counts = [0] * len(self._takes)
        for blow in self._guide.snapshot().blows:
            holding = [i for i, take in enumerate(self._takes) if take.first_frame <= blow.frame]
            if blow.counts and holding:
                counts[holding[-1]] += 1
        return tuple(replace(t, usable=n) for t, n in zip(self._takes, counts, strict=True))
