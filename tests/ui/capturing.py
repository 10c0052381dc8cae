"""Drive the capture screens: time that passes when a test says so, and a host to hold a screen."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable
from pathlib import Path
from typing import ClassVar

from textual.app import App
from textual.binding import Binding, BindingType
from textual.pilot import Pilot

from fieldkit.capture.practice import PracticeSensor, PracticeSource, Surroundings
from fieldkit.capture.session import Session
from fieldkit.capture.setup import ChannelSetup
from fieldkit.ui import app as app_module
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.capture.tap_run import TapRun
from tests.capture.practice_rig import RATE_HZ, plant
from tests.capture.rig import GENEROUS_S

CHANNEL = ChannelSetup(sensitivity="100 mV/g", full_scale="0.7 V", direction="vertical", at="1.0 m")


class StepPace:
    """Time for the practice rig that passes only as far as it is granted, and as it is heard."""

    def __init__(self) -> None:
        self.unheard: Callable[[], int] = lambda: 0
        """Frames that were delivered and that nobody has taken yet."""
        self._now_s = self._granted_s = 0.0
        self._wanted_s: float | None = None
        self._changed = threading.Condition()

    def now_s(self) -> float:
        return self._now_s

    def wait(self, seconds: float, stop: threading.Event) -> None:
        with self._changed:
            wanted_s = self._wanted_s = self._now_s + max(seconds, 0.0)
            while self._granted_s < wanted_s and not stop.is_set():
                self._changed.wait(0.02)
            if not stop.is_set():
                self._now_s = wanted_s
            if self._wanted_s == wanted_s:
                self._wanted_s = None

    def grant(self, seconds: float) -> None:
        with self._changed:
            self._granted_s = self._now_s + seconds
            self._changed.notify_all()

    @property
    def used_up(self) -> bool:
        """Whether the rig waits for more time, and all that it delivered was taken."""
        with self._changed:
            waits = self._wanted_s is not None and self._wanted_s > self._granted_s
        return waits and self.unheard() == 0


class Host(App[object]):
    """An app that does nothing but hold one screen."""

    CSS_PATH = Path(app_module.__file__).with_name("app.tcss")
    HORIZONTAL_BREAKPOINTS = FieldkitApp.HORIZONTAL_BREAKPOINTS
    VERTICAL_BREAKPOINTS = FieldkitApp.VERTICAL_BREAKPOINTS
    BINDINGS: ClassVar[list[BindingType]] = [Binding("ctrl+q", "quit", show=False)]

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
    run = TapRun(rig(pace), (CHANNEL,), folder / "job.toml", 100.0)
    followed(run.session, pace)
    return run


def followed(session: Session, pace: StepPace) -> None:
    """Let the rig wait for a session that is slow to hear it."""
    inbox = session._inbox
    pace.unheard = lambda: inbox._arrived - inbox._taken


async def play(pilot: Pilot[None], pace: StepPace, wanted: Callable[[], bool]) -> None:
    """Let the rig's time pass until something holds."""
    end_s = time.monotonic() + GENEROUS_S
    while not wanted():
        assert time.monotonic() < end_s, "it never came"
        pace.grant(0.2)
        for _ in range(200):
            await pilot.pause(0.005)
            if pace.used_up or wanted():
                break


async def until(pilot: Pilot[None], wanted: Callable[[], bool]) -> None:
    """Handle messages until something holds, however slow the computer is."""
    end_s = time.monotonic() + GENEROUS_S
    while not wanted():
        assert time.monotonic() < end_s, "it never came"
        await pilot.pause(0.01)


async def on_screen(pilot: Pilot[None], kind: type) -> None:
    """Handle messages until a screen of a kind has the keys."""
    await until(pilot, lambda: isinstance(pilot.app.screen, kind) and pilot.app.screen.is_mounted)
    await pilot.pause()
