"""The live screens on a real audio server that freezes or dies under them."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from pathlib import Path

import numpy as np
import pytest
import soundfile
from textual.pilot import Pilot
from textual.widgets import Static

from fieldkit.capture.devices import find_input, list_inputs
from fieldkit.capture.portaudio import PortAudioSource
from fieldkit.capture.practice import PracticeSensor, PracticeSource
from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.sidecar import gaps_of, read_info
from fieldkit.ui.capture.takes import Result
from fieldkit.ui.capture.tap_run import TapRun
from fieldkit.ui.capture.tap_screen import TapScreen
from fieldkit.ui.dialogs import AskScreen
from tests.capture.practice_rig import plant
from tests.capture.rig import RATE_HZ, Bench, end_portaudio, pulse_bench
from tests.ui.capturing import Host, on_screen, until

CHANNEL = ChannelSetup(sensitivity="100 mV/g", full_scale="1.4 V", direction="vertical", at="1 m")


@pytest.fixture
def audio(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[Bench]:
    """A server of its own; PortAudio in this process finds it."""
    with pulse_bench(tmp_path / "audio") as made:
        for name, value in made.environment.items():
            monkeypatch.setenv(name, value)
        try:
            yield made
        finally:
            if made.server is not None and made.server.poll() is None:
                made.thaw()
            end_portaudio()


class Shown:
    """A guided tap test on the server's input."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.app = Host(lambda: TapScreen(self._begin, "Beam", "SI"))

    def _begin(self) -> TapRun:
        device = find_input("bench", list_inputs(check_rates=False))
        source = PortAudioSource(device, rate_hz=RATE_HZ, channels=1)
        return TapRun(source, (CHANNEL,), self.folder / "job.toml", 100.0)

    @property
    def screen(self) -> TapScreen:
        screen = self.app.screen_stack[1]
        assert isinstance(screen, TapScreen)
        return screen

    def words(self, selector: str) -> str:
        return str(self.screen.query_one(selector, Static).render())

    def phase(self) -> str:
        return self.screen.run.look().guide.phase if self.screen.run else ""

    def frames(self) -> int:
        return self.screen.run.look().session.frames if self.screen.run else 0

    async def struck(self, pilot: Pilot[None], audio: Bench, number: int) -> None:
        """One blow, from armed to its verdict."""
        await until(pilot, lambda: self.phase() == "armed")
        audio.play(blow())
        await until(pilot, lambda: f"✓ Blow {number}" in self.words("#told"))


def blow() -> np.ndarray:
    """A beam that is struck, as (n, 2) int16."""
    rig = PracticeSource(plant(), [PracticeSensor(1.0, "vertical")], rate_hz=RATE_HZ)
    rig.tap()
    heard = np.concatenate([rig.block(0).samples for _ in range(200)])
    return np.round(32767 * np.repeat(heard, 2, axis=1)).astype(np.int16)


FAULTS: dict[str, tuple[Callable[[Bench], None], Callable[[Bench], None], str]] = {
    "frozen": (Bench.freeze, Bench.thaw, "the audio server behind bench does not answer"),
    "killed": (Bench.kill, Bench.begin, "bench is gone"),
}


@pytest.mark.parametrize("fault", FAULTS)
async def test_a_server_that_fails_costs_a_marked_gap_and_nothing_else(
    audio: Bench, tmp_path: Path, fault: str
) -> None:
    """One sentence on the screen, the keys answer meanwhile, and the next blow counts as before."""
    harm, mend, says = FAULTS[fault]
    shown = Shown(tmp_path)
    async with shown.app.run_test(size=(80, 24)) as pilot:
        await until(pilot, lambda: shown.frames() > 0)
        await shown.struck(pilot, audio, 1)
        harm(audio)
        await until(pilot, lambda: says in " ".join(shown.words("#told").split()).lower())
        told = " ".join(shown.words("#told").split())
        assert told.count(".") == 1
        assert "what was recorded is safe, and it goes on when the input is back" in told
        assert "goes on by itself" in shown.words("#now")
        await pilot.press("v")
        await until(pilot, lambda: shown.screen.has_class("-after"))
        recording = tmp_path / "tap-1.wav"
        assert soundfile.info(str(recording)).frames > 3 * RATE_HZ
        mend(audio)
        gone = shown.frames()
        await until(pilot, lambda: shown.frames() > gone)
        await shown.struck(pilot, audio, 2)
        await pilot.press("s")
        await until(pilot, lambda: shown.app.result is not None)
    result = shown.app.result
    assert isinstance(result, Result)
    assert [(take.path.name, take.usable) for take in result.takes] == [("tap-1.wav", 2)]
    assert result.trouble == ""
    assert says in gaps_of(recording)[0].cause
    info = read_info(recording)
    assert info is not None
    assert info.ended == "stopped by the user"


async def test_a_frozen_server_keeps_nobody_from_leaving(audio: Bench, tmp_path: Path) -> None:
    """Nor does it cost what was recorded."""
    shown = Shown(tmp_path)
    async with shown.app.run_test(size=(80, 24)) as pilot:
        await until(pilot, lambda: shown.frames() > 0)
        await shown.struck(pilot, audio, 1)
        audio.freeze()
        await pilot.press("ctrl+q")
        await on_screen(pilot, AskScreen)
        await pilot.press("enter")
        await until(pilot, lambda: shown.app.result is not None)
        result = shown.app.result
        assert isinstance(result, Result)
        assert (result.add, result.quits, result.trouble) == (True, True, "")
        audio.thaw()
    assert soundfile.info(str(tmp_path / "tap-1.wav")).frames > 3 * RATE_HZ
