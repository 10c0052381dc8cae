"""Drive the capture screens: time that passes when a test says so, and a host to hold a screen."""

from __future__ import annotations

import threading
from collections.abc import Callable
from pathlib import Path

from textual.app import App
from textual.pilot import Pilot

from fieldkit.capture.practice import PracticeSensor, PracticeSource, Surroundings
from fieldkit.capture.setup import ChannelSetup
from fieldkit.ui import app as app_module
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.capture.tap_run import TapRun
from tests.capture.practice_rig import RATE_HZ, plant

CHANNEL = ChannelSetup(sensitivity="100 mV/g", full_scale="0.7 V", direction="vertical", at="1.0 m")


class StepPace:
    """Time for the practice rig that passes only as far as it is granted."""

    def __init__(self) -> None:
        self._now_s = self._granted_s = 0.0
        self._changed = threading.Condition()

    def now_s(self) -> float:
        return self._now_s

    def wait(self, seconds: float, stop: threading.Event) -> None:
        target_s = self._now_s + max(seconds, 0.0)
        with self._changed:
            while self._granted_s < target_s and not stop.is_set():
                self._changed.wait(0.02)
        self._now_s = target_s

    def grant(self, seconds: float) -> None:
        with self._changed:
            self._granted_s = self._now_s + seconds
            self._changed.notify_all()

    @property
    def used_up(self) -> bool:
        return self._now_s >= self._granted_s - 0.03


class Host(App[object]):
    """An app that does nothing but hold one screen."""

    CSS_PATH = Path(app_module.__file__).with_name("app.tcss")
    HORIZONTAL_BREAKPOINTS = FieldkitApp.HORIZONTAL_BREAKPOINTS
    VERTICAL_BREAKPOINTS = FieldkitApp.VERTICAL_BREAKPOINTS

    def __init__(self, held: Callable[[], object]) -> None:
        super().__init__()
        self.held = held
        self.result: object = None

    def on_mount(self) -> None:
        self.push_screen(self.held(), self._take)  # type: ignore[call-overload]

    def _take(self, result: object) -> None:
        self.result = result


def rig(pace: StepPace, **more: object) -> PracticeSource:
    """A small beam with two modes, and a pump."""
    return PracticeSource(
        plant(),
        [PracticeSensor(1.0, "vertical")],
        rate_hz=RATE_HZ,
        surroundings=Surroundings(noise=4e-3),
        pace=pace,
        **more,  # type: ignore[arg-type]
    )


def tap_run(folder: Path, pace: StepPace) -> TapRun:
    """A guided tap test on that beam."""
    return TapRun(rig(pace), (CHANNEL,), folder / "job.toml", 100.0)


async def play(
    pilot: Pilot[None], pace: StepPace, wanted: Callable[[], bool], most_s: float = 90.0
) -> None:
    """Let the rig's time pass until something holds."""
    passed_s = 0.0
    while not wanted():
        assert passed_s < most_s, "it never came"
        pace.grant(0.2)
        passed_s += 0.2
        for _ in range(200):
            await pilot.pause(0.005)
            if pace.used_up:
                break
