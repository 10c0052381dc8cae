"""The practice rig of a small span, driven as fast as it is listened to."""

from __future__ import annotations

import numpy as np

from fieldkit.capture.guide_snapshot import GuideSnapshot
from fieldkit.capture.guided_test import GuidedTest
from fieldkit.capture.places import Ear, Place
from fieldkit.capture.practice import PracticeSensor, PracticeSource, Surroundings
from fieldkit.capture.practice_plant import PracticeMachine, PracticePlant
from tests.capture.rig import until

RATE_HZ = 4000
AT = Place("vertical", 1.0)


def plant(*frequency_hz: float, damping: float = 0.012) -> PracticePlant:
    """A made-up beam of 4 m along x: sine shapes, upright modes and sideways ones a fifth lower."""
    upright = np.array(frequency_hz or (24.0, 61.0))
    station_m = np.linspace(0, 4, 41)
    waves = [np.sin((n + 1) * np.pi * station_m / 4) / np.sqrt(20) for n in range(len(upright))]
    zero = np.zeros_like(station_m)
    shape = [np.stack([zero, zero, w], axis=1) for w in waves]
    shape += [np.stack([zero, w, zero], axis=1) for w in waves]
    tangent = np.tile([1.0, 0.0, 0.0], (41, 1))
    machine = PracticeMachine("pump", 1480.0, ((1.0, 40.0), (2.0, 20.0)), 0.3)
    frequency = np.concatenate([upright, 0.8 * upright])
    return PracticePlant(
        "beam",
        frequency,
        np.full(len(frequency), damping),
        station_m,
        tangent,
        np.array(shape),
        machine,
    )


class Rig:
    """A source and a guided test beside each other, without a session and without waiting."""

    def __init__(self, source: PracticeSource | None = None, **more: object) -> None:
        around = Surroundings(noise=4e-3)
        self.source = source or PracticeSource(
            plant(), [PracticeSensor(1.0, "vertical")], rate_hz=RATE_HZ, surroundings=around
        )
        self.marks: list[tuple[int, bool]] = []
        sensors = self.source.sensors
        hammers = [i for i, sensor in enumerate(sensors) if sensor.hammer]
        ears = [
            Ear(i, Place(sensor.direction, sensor.at_m), sensor.full_scale)
            for i, sensor in enumerate(sensors)
            if not sensor.hammer
        ]
        self.test = GuidedTest(
            rate_hz=self.source.rate_hz,
            ears=ears,
            hammer=hammers[0] if hammers else None,
            mark=lambda frame, aside: self.marks.append((frame, aside)),
            **more,  # type: ignore[arg-type]
        )
        self.frame = 0

    def run(self, seconds: float) -> GuideSnapshot:
        """Let time pass on the rig."""
        end = self.frame + seconds * self.source.rate_hz
        while self.frame < end:
            block = self.source.block(self.frame)
            self.frame += len(block.samples)
            self.test.feed(block)
        return self.test.snapshot()

    def armed(self, within_s: float = 40.0) -> None:
        """Let time pass until it is armed."""
        for _ in range(round(within_s / 0.1)):
            if self.test.snapshot().phase == "armed":
                return
            self.run(0.1)
        raise AssertionError(f"not armed: {self.test.snapshot().phase}")

    def struck(
        self, strength: float = 1.0, *, quiet_s: float = 1.0, **more: object
    ) -> GuideSnapshot:
        """One blow, from armed to what is made of it."""
        self.armed()
        self.run(quiet_s)
        before = len(self.test.snapshot().blows)
        self.source.tap(strength, **more)  # type: ignore[arg-type]
        for _ in range(400):
            self.run(0.1)
            if self.test.snapshot().phase not in ("armed", "recording"):
                break
        until(lambda: len(self.test.snapshot().blows) > before, 60.0)
        return self.thought()

    def thought(self) -> GuideSnapshot:
        """Once nothing is being computed any more."""
        until(lambda: not self.test.snapshot().estimating, 60.0)
        return self.test.snapshot()
