"""The set-up before a measurement: what is offered, what is refused, and that it never waits."""

from __future__ import annotations

import sys
import threading
from collections.abc import Callable
from pathlib import Path

import pytest
from textual.pilot import Pilot
from textual.widgets import Static

from fieldkit.capture.devices import Input
from fieldkit.capture.presets import Preset, presets, save_preset
from fieldkit.capture.setup import ChannelSetup
from fieldkit.errors import Refusal
from fieldkit.ui.capture.bench import Bench
from fieldkit.ui.capture.setup_screen import SetupScreen
from fieldkit.ui.capture.wiring import LAST, Wiring
from fieldkit.ui.dialogs import PickScreen
from fieldkit.ui.forms import FormWindow
from fieldkit.ui.table import Table
from tests.ui import glycol
from tests.ui.capturing import Host, StepPace, on_screen, until
from tests.ui.driving import SIZES, fill

INTERFACE = Input(3, "Interface 2 in", "ALSA", 2, 48000, (44100, 48000, 96000), True)
Lister = Callable[[], tuple[Input, ...]]


def refusing(reason: str, remedy: str = "") -> Lister:
    def lister() -> tuple[Input, ...]:
        raise Refusal(reason, remedy)

    return lister


class Shown:
    """A set-up screen, and what stands on it."""

    def __init__(self, folder: Path, lister: Lister, kind: str = "tap", **more: object) -> None:
        self.presets = folder / "presets.toml"
        bench = Bench(list_inputs=lister, presets_path=self.presets, pace=StepPace())
        self.app = Host(lambda: SetupScreen(Wiring(kind), glycol.job(), bench, **more))  # type: ignore[arg-type]

    @property
    def screen(self) -> SetupScreen:
        screen = self.app.screen_stack[1]
        assert isinstance(screen, SetupScreen)
        return screen

    def words(self, selector: str) -> str:
        return " ".join(str(self.screen.query_one(selector, Static).render()).split())

    def rows(self, selector: str) -> list[list[str]]:
        table = self.screen.query_one(selector, Table)
        return [[cell.plain for cell in table.get_row_at(i)] for i in range(table.row_count)]

    async def listed(self, pilot: Pilot[None]) -> None:
        await until(pilot, lambda: not self.screen.looking)
        await pilot.pause()


@pytest.mark.parametrize("size", SIZES)
async def test_without_an_input_the_rig_is_offered_and_all_else_named(
    tmp_path: Path, size: tuple[int, int]
) -> None:
    shown = Shown(tmp_path, refusing("this computer has no audio input", "plug one in"))
    async with shown.app.run_test(size=size) as pilot:
        await shown.listed(pilot)
        said = shown.words("#inputs-said")
        assert "This computer has no audio input; plug one in." in said
        assert "all else works" in said
        assert shown.rows("#inputs")[0][0] == "No sensor here: practice rig"
        assert shown.rows("#channels") == [
            ["1", "acceleration", "100 mV/g", "0.7 V", "vertical", "2.23 m"]
        ]
        assert "permit" in shown.words("#setup-caution")
        for widget in shown.screen.query("SetupScreen > *"):
            assert widget.region.bottom <= size[1]
        await pilot.press("g")
        await until(pilot, lambda: shown.app.result is not None)
        assert isinstance(shown.app.result, Wiring)
        assert shown.app.result.practice


async def test_a_missing_portaudio_is_said_with_how_to_install_it(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setitem(sys.modules, "sounddevice", None)
    from fieldkit.capture.devices import list_inputs

    shown = Shown(tmp_path, list_inputs)
    async with shown.app.run_test(size=(80, 24)) as pilot:
        await shown.listed(pilot)
        said = shown.words("#inputs-said")
        assert "PortAudio, which reads the inputs, is missing; install" in said
        assert "practice rig" in said


async def test_a_stuck_audio_system_keeps_nobody_waiting(tmp_path: Path) -> None:
    """While the list does not come, channels can be changed, and the screen can be left."""
    free = threading.Event()

    def stuck() -> tuple[Input, ...]:
        free.wait(60.0)
        return ()

    shown = Shown(tmp_path, stuck)
    async with shown.app.run_test(size=(80, 24)) as pilot:
        assert "Looking for inputs" in shown.words("#inputs-said")
        await pilot.press("e")
        await until(pilot, lambda: isinstance(shown.app.screen, FormWindow))
        await fill(pilot, sensitivity="50 mV/g")
        await pilot.press("enter")
        await until(pilot, lambda: shown.rows("#channels")[0][2] == "50 mV/g")
        await pilot.press("escape")
        await until(pilot, lambda: len(shown.app.screen_stack) == 1)
    free.set()


async def test_an_input_is_chosen_by_the_cursor_and_kept_for_the_next_visit(
    tmp_path: Path,
) -> None:
    """Channels, rates and presets; what the rig calibrates never passes for a real sensor."""
    shown = Shown(tmp_path, lambda: (INTERFACE,))
    async with shown.app.run_test(size=(80, 24)) as pilot:
        await shown.listed(pilot)
        assert shown.rows("#inputs")[1] == ["Interface 2 in", "2", "44.1 48 96", "ALSA, default"]
        await pilot.press("down")
        await until(pilot, lambda: shown.screen.wiring.device == INTERFACE)
        assert shown.rows("#channels")[0][2] == "uncalibrated"
        await pilot.press("r")
        await on_screen(pilot, FormWindow)
        await fill(pilot, channels="2", rate="96 kHz")
        await pilot.press("enter")
        await until(pilot, lambda: len(shown.rows("#channels")) == 2)
        assert "96 kHz" in shown.words("#setup-said")
        await pilot.press("g")
        await until(pilot, lambda: shown.app.result is not None)
    kept = presets(shown.presets)[LAST]
    assert (kept.device, kept.rate_hz, len(kept.channels)) == ("Interface 2 in", 96000, 2)


async def test_a_rate_that_the_input_does_not_take_is_refused(tmp_path: Path) -> None:
    shown = Shown(tmp_path, lambda: (INTERFACE,))
    async with shown.app.run_test(size=(80, 24)) as pilot:
        await shown.listed(pilot)
        await pilot.press("down")
        await until(pilot, lambda: shown.screen.wiring.device == INTERFACE)
        await pilot.press("r")
        await on_screen(pilot, FormWindow)
        await fill(pilot, rate="50 kHz")
        await pilot.press("enter")
        window = shown.app.screen
        assert isinstance(window, FormWindow)
        says = window.query_one("#form-says", Static)
        await until(pilot, lambda: "choose one of 44.1, 48, 96 kHz" in str(says.render()))
        assert shown.app.screen is window


async def test_the_last_set_up_comes_back(tmp_path: Path) -> None:
    channels = (ChannelSetup(sensitivity="98 mV/g", full_scale="1.4 V", direction="lateral"),)
    save_preset(LAST, Preset(channels, "Interface 2 in", 44100), tmp_path / "presets.toml")
    shown = Shown(tmp_path, lambda: (INTERFACE,), fresh=True)
    async with shown.app.run_test(size=(80, 24)) as pilot:
        await shown.listed(pilot)
        assert shown.screen.wiring.device == INTERFACE
        assert shown.rows("#channels")[0][2:5] == ["98 mV/g", "1.4 V", "lateral"]
        assert "44.1 kHz" in shown.words("#setup-said")


async def test_a_set_up_is_kept_and_taken_by_name(tmp_path: Path) -> None:
    shown = Shown(tmp_path, refusing("no input"))
    async with shown.app.run_test(size=(80, 24)) as pilot:
        await shown.listed(pilot)
        await pilot.press("k")
        await on_screen(pilot, FormWindow)
        await fill(pilot, name="sensor A")
        await pilot.press("enter")
        await until(pilot, lambda: "sensor A" in shown.words("#setup-said"))
        assert list(presets(shown.presets)) == ["sensor A"]
        await pilot.press("p")
        await on_screen(pilot, PickScreen)
        await pilot.press("enter")
        await on_screen(pilot, SetupScreen)
        assert len(shown.app.screen_stack) == 2


async def test_length_and_speed_of_a_running_recording_are_typed(tmp_path: Path) -> None:
    shown = Shown(tmp_path, refusing("no input"), "running")
    async with shown.app.run_test(size=(80, 24)) as pilot:
        await shown.listed(pilot)
        assert "60 s" in shown.words("#setup-said")
        await pilot.press("r")
        await on_screen(pilot, FormWindow)
        await fill(pilot, seconds="90", **{"speed of pump": "1480 rpm"})
        await pilot.press("enter")
        await until(pilot, lambda: "90 s, pump 1480 rpm" in shown.words("#setup-said"))
