"""The guided tap test by keys, on a practice rig whose time passes when the test says so."""

from __future__ import annotations

from pathlib import Path

import pytest
from textual.pilot import Pilot
from textual.widgets import Static

from fieldkit.capture.sidecar import read_info
from fieldkit.capture.snapshot import ENDED, RUNNING, WAITING
from fieldkit.errors import Refusal
from fieldkit.ui.capture.takes import Result
from fieldkit.ui.capture.tap_run import TapRun
from fieldkit.ui.capture.tap_screen import TapScreen
from fieldkit.ui.dialogs import AskScreen, PickScreen
from fieldkit.ui.forms import FormWindow
from tests.ui.capturing import Host, StepPace, on_screen, play, tap_run, until


class Bench:
    """A tap screen over a small rig."""

    def __init__(self, folder: Path) -> None:
        self.pace = StepPace()
        self.folder = folder
        self.runs: list[TapRun] = []
        self.app = Host(lambda: TapScreen(self._begin, "Beam", "SI"))

    def _begin(self) -> TapRun:
        self.runs.append(tap_run(self.folder, self.pace))
        return self.runs[-1]

    @property
    def run(self) -> TapRun:
        return self.runs[-1]

    @property
    def blows(self) -> int:
        return len(self.run.look().guide.blows) if self.runs else 0

    def phase(self) -> str:
        return self.run.look().guide.phase if self.runs else ""

    def words(self, selector: str) -> str:
        return str(self.app.screen_stack[1].query_one(selector, Static).render())

    async def armed(self, pilot: Pilot[None]) -> None:
        await play(pilot, self.pace, lambda: self.phase() == "armed")

    async def struck(self, pilot: Pilot[None], *keys: str) -> None:
        """One blow, from armed to its verdict on the screen."""
        await self.armed(pilot)
        before = self.blows
        await pilot.press(*(keys or ("space",)))
        await play(pilot, self.pace, lambda: self.blows > before)
        await until(pilot, lambda: f"Blow {before + 1}:" in self.words("#told"))


@pytest.fixture
def bench(tmp_path: Path) -> Bench:
    return Bench(tmp_path)


async def test_three_blows_give_modes_and_the_next_direction(bench: Bench) -> None:
    """Verdict, modes with their scatter, and what to do next stand on the screen."""
    async with bench.app.run_test(size=(80, 24)) as pilot:
        for _ in range(3):
            await bench.struck(pilot)
        await play(pilot, bench.pace, lambda: not bench.run.look().guide.estimating)
        await until(pilot, lambda: "modes from 3 blows" in bench.words("#live-modes"))
        first = bench.words("#live-modes").splitlines()[1].split()[0]
        assert float(first) == pytest.approx(24.0, abs=0.02)
        assert "✓ Blow 3" in bench.words("#told")
        assert "vertical at 1.00 m\n3 good of 3 blows" in bench.words("#side")
        assert "SIMULATED" in bench.words("#live-title")
        await pilot.press("d")
        await on_screen(pilot, FormWindow)
        await pilot.press("enter")
        await play(pilot, bench.pace, lambda: bench.phase() == "listening")
        assert "lateral at 1.0" in bench.words("#side")
        await bench.struck(pilot)
        await pilot.press("s")
        await until(pilot, lambda: bench.app.result is not None)
        result = bench.app.result
        assert isinstance(result, Result)
        assert result.add
        assert [(t.path.name, t.usable, t.channels[0].direction) for t in result.takes] == [
            ("tap-1.wav", 3, "vertical"),
            ("tap-2.wav", 1, "lateral"),
        ]
        assert all(read_info(take.path).simulated for take in result.takes)


async def test_a_double_blow_says_what_to_change(bench: Bench) -> None:
    async with bench.app.run_test(size=(80, 24)) as pilot:
        await bench.armed(pilot)
        await pilot.press("x")
        await on_screen(pilot, PickScreen)
        await pilot.press("enter")  # the first fault offered is a double blow
        await play(pilot, bench.pace, lambda: bench.blows == 1)
        await until(pilot, lambda: "Blow 1" in bench.words("#told"))
        assert "✗ Blow 1: A second blow" in bench.words("#told")
        assert "Let the hammer rebound once" in bench.words("#told")
        assert "0 good of 1 blow" in bench.words("#side")


async def test_u_sets_a_blow_aside_in_the_recording_too(bench: Bench) -> None:
    async with bench.app.run_test(size=(80, 24)) as pilot:
        await bench.struck(pilot)
        await pilot.press("u")
        await until(pilot, lambda: "Set aside" in bench.words("#told"))
        assert "0 good of 1 blow" in bench.words("#side")
        recording = bench.folder / "tap-1.wav"
        await until(pilot, lambda: len(read_info(recording).set_aside) == 1)
        await pilot.press("U")
        await until(pilot, lambda: "1 good of 1 blow" in bench.words("#side"))
        await until(pilot, lambda: read_info(recording).set_aside == ())


async def test_leaving_asks_only_where_blows_would_not_reach_the_job(bench: Bench) -> None:
    async with bench.app.run_test(size=(80, 24)) as pilot:
        await bench.struck(pilot)
        await pilot.press("escape")
        await on_screen(pilot, AskScreen)
        await pilot.press("escape")
        await on_screen(pilot, TapScreen)
        await pilot.press("escape")
        await on_screen(pilot, AskScreen)
        await pilot.press("right", "enter")
        await until(pilot, lambda: bench.app.result is not None)
        assert isinstance(bench.app.result, Result)
        assert not bench.app.result.add
        assert (bench.folder / "tap-1.wav").exists()


async def test_ctrl_q_asks_as_leaving_does_and_ends_the_recording_safely(bench: Bench) -> None:
    """Going on goes on; kept, the recording is whole on the disk before the app is told to end."""
    async with bench.app.run_test(size=(80, 24)) as pilot:
        await bench.struck(pilot)
        await pilot.press("ctrl+q")
        await on_screen(pilot, AskScreen)
        await pilot.press("escape")
        await on_screen(pilot, TapScreen)
        await bench.struck(pilot)
        await pilot.press("ctrl+q")
        await on_screen(pilot, AskScreen)
        await pilot.press("enter")
        await until(pilot, lambda: bench.app.result is not None)
    result = bench.app.result
    assert isinstance(result, Result)
    assert (result.add, result.quits) == (True, True)
    assert [take.usable for take in result.takes] == [2]
    assert read_info(bench.folder / "tap-1.wav").ended == "stopped by the user"


async def test_ctrl_q_needs_no_answer_where_nothing_was_struck(bench: Bench) -> None:
    async with bench.app.run_test(size=(80, 24)) as pilot:
        await bench.armed(pilot)
        await pilot.press("ctrl+q")
        await until(pilot, lambda: bench.app.result is not None)
    assert isinstance(bench.app.result, Result)
    assert bench.app.result.quits


async def test_leaving_an_empty_practice_goes_back_and_leaves_nothing(bench: Bench) -> None:
    async with bench.app.run_test(size=(80, 24)) as pilot:
        await bench.armed(pilot)
        await pilot.press("escape")
        await until(pilot, lambda: bench.app.result is not None)
        assert isinstance(bench.app.result, Result)
        assert bench.app.result.again
        assert not list(bench.folder.iterdir())


async def test_an_input_that_is_gone_is_told_and_goes_on_when_it_is_back(bench: Bench) -> None:
    async with bench.app.run_test(size=(80, 24)) as pilot:
        await bench.struck(pilot)
        bench.run.strike("unplug")
        await until(pilot, lambda: bench.run.look().session.state == WAITING)
        await until(pilot, lambda: "unplugged" in bench.words("#told"))
        assert "goes on by itself" in bench.words("#now")
        await play(pilot, bench.pace, lambda: bench.run.look().session.state == RUNNING)
        await until(pilot, lambda: "practice rig is back" in bench.words("#told"))


async def test_the_session_ends_with_the_screen(bench: Bench) -> None:
    """Also where the app leaves without a word."""
    async with bench.app.run_test(size=(80, 24)) as pilot:
        await bench.armed(pilot)
    assert bench.run.session.join(10.0)
    assert bench.run.session.snapshot().state == ENDED


async def test_what_cannot_be_opened_is_said_and_escape_goes_back() -> None:
    def begin() -> TapRun:
        raise Refusal("the input is held by another program", "close it")

    app = Host(lambda: TapScreen(begin, "Beam", "SI"))
    async with app.run_test(size=(80, 24)) as pilot:
        screen = app.screen
        await until(pilot, lambda: "held by another" in str(screen.query_one("#now").render()))
        await pilot.press("space", "escape")
        await until(pilot, lambda: app.result is not None)
        assert isinstance(app.result, Result)
        assert app.result.again
