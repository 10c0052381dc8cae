"""One moment of a guided tap test, written down: what the pictures are made of."""

from __future__ import annotations

import numpy as np

from fieldkit.capture.blow import BlowReading, Trace
from fieldkit.capture.enough import Worth
from fieldkit.capture.guide import Blow
from fieldkit.capture.guide_snapshot import GuideSnapshot
from fieldkit.capture.joint import JointReading
from fieldkit.capture.live import LivePicture
from fieldkit.capture.meter import ChannelLevel
from fieldkit.capture.places import Ear, Place
from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.snapshot import RUNNING, Snapshot
from fieldkit.capture.trigger import Threshold
from fieldkit.capture.verdict import Verdict
from fieldkit.signal.modes import MeasuredMode, ModeEstimate
from fieldkit.ui.capture.takes import Take
from fieldkit.ui.capture.tap_run import TapLook

PLACE = Place("vertical", 1.9)
EAR = Ear(0, PLACE)
FREQUENCY_HZ = np.arange(0.0, 100.0, 0.25)


def decay() -> Trace:
    """A quarter of a second of quiet, then 23.4 Hz that dies away."""
    time_s = np.arange(400) * 0.01 - 0.25
    size = np.where(time_s >= 0, 0.4 * np.exp(-1.6 * np.maximum(time_s, 0)), 0.01)
    return Trace(-0.25, 0.01, -size, size)


def blow(number: int, kind: str = "usable", what: str = "", *, aside: bool = False) -> Blow:
    verdict = Verdict(kind, what)
    reading = BlowReading(1000 * number, verdict, 0.4, decay(), None, None, np.empty(0))
    joint = JointReading(1000 * number, verdict, (EAR,), (reading,), 0, (PLACE,))
    return Blow(number, 1000 * number, (PLACE,), verdict, joint, aside)


BLOWS = (
    blow(1),
    blow(2, "double", "a second blow 60 ms after the first"),
    blow(3),
    blow(4, aside=True),
    blow(5, "clipped", "the input was at its limit"),
)
MODES = (
    MeasuredMode(23.41, 0.02, 0.0110, 0.0006, "vertical", 2, 1.0, at_m=1.9),
    MeasuredMode(61.77, 0.05, 0.0142, 0.0011, "vertical", 2, 0.42, at_m=1.9),
)


def guide(phase: str = "armed") -> GuideSnapshot:
    return GuideSnapshot(
        phase=phase,
        instruction="armed: strike once",
        advice="1 more good blow wanted: three blows must agree before they are believed",
        ears=(EAR,),
        thresholds=(Threshold(0.005, 0.001, 0.02, 0.01),),
        ringing_s=None,
        record_s=8.0,
        blows=BLOWS,
        estimate=ModeEstimate(MODES, (), (), ()),
        estimated_from=2,
        wanted=PLACE,
        worth=Worth(1, "three blows must agree", 1e-3, 8e-4),
        estimating=False,
        estimates=(),
    )


def picture() -> LivePicture:
    """Two resonances over a floor."""
    now = 1e-3 + sum(
        a / np.hypot((FREQUENCY_HZ / f) ** 2 - 1, 0.03) for f, a in ((23.4, 2e-3), (61.8, 1e-3))
    )
    return LivePicture(1, FREQUENCY_HZ, now, now, 4.0, 0.01, "m/s^2")


def look(*, simulated: bool = True, phase: str = "armed") -> TapLook:
    session = Snapshot(
        state=RUNNING,
        source="the practice rig" if simulated else "Interface 2 in",
        simulated=simulated,
        rate_hz=8000,
        frames=800_000,
        lost_frames=0,
        gaps=0,
        levels=(ChannelLevel(0.05, 0.4, False, 0), ChannelLevel(0.6, 1.0, True, 3)),
        message="",
    )
    channels = (ChannelSetup(direction="vertical", at="1.9 m"), ChannelSetup(quantity="force"))
    return TapLook(session, guide(phase), picture(), channels, 0)


class StillRun:
    """A run in which nothing moves."""

    practice = True
    trouble = ""

    def __init__(self, shown: TapLook) -> None:
        self.shown = shown
        self.stopped = 0

    def look(self) -> TapLook:
        return self.shown

    def strike(self, fault: str = "", strength: float = 1.0) -> bool:
        return True

    def stop(self) -> None:
        self.stopped += 1

    def finish(self) -> tuple[Take, ...]:
        return ()
