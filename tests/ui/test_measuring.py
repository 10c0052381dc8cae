"""From the start screen over the practice rig to ranked changes, and what never mixes."""

from __future__ import annotations

from pathlib import Path

import pytest
from textual.pilot import Pilot

from fieldkit.capture.devices import Input
from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.sidecar import RecordingInfo, write_info
from fieldkit.errors import Refusal
from fieldkit.job.schema import load_job
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.capture.bench import Bench
from fieldkit.ui.capture.setup_screen import SetupScreen
from fieldkit.ui.capture.takes import Result, Take
from fieldkit.ui.capture.tap_screen import TapScreen
from fieldkit.ui.capture.wiring import Wiring
from fieldkit.ui.dialogs import AskScreen, PathScreen, PickScreen
from fieldkit.ui.forms import FormWindow
from fieldkit.ui.start.start_screen import StartScreen
from tests.capture.rig import require
from tests.ui.capturing import StepPace, on_screen, play, until
from tests.ui.driving import opened, rows_of, said, settled, text_of

INTERFACE = Input(3, "Interface 2 in", "ALSA", 2, 48000, (48000,), True)


def no_input() -> tuple[Input, ...]:
    raise Refusal("this computer has no audio input")


def bench_of(folder: Path, pace: StepPace | None = None, *inputs: Input) -> Bench:
    lister = (lambda: inputs) if inputs else no_input
    return Bench(list_inputs=lister, pace=pace, presets_path=folder / "presets.toml")


async def struck(pilot: Pilot[None], pace: StepPace, blows: int) -> None:
    """So many blows more, from armed to their verdict."""
    screen = pilot.app.screen
    assert isinstance(screen, TapScreen)
    await until(pilot, lambda: screen.run is not None)
    for _ in range(blows):
        await play(pilot, pace, lambda: screen.run.look().guide.phase == "armed")
        before = len(screen.run.look().guide.blows)
        await pilot.press("space")
        await play(pilot, pace, lambda n=before: len(screen.run.look().guide.blows) > n)


async def practising(pilot: Pilot[None]) -> None:
    """From the start screen to the guided tap test of the practice rig."""
    await on_screen(pilot, StartScreen)
    await pilot.press("p")
    await on_screen(pilot, PathScreen)
    await pilot.press("enter")
    await on_screen(pilot, SetupScreen)
    await pilot.press("g")
    await on_screen(pilot, TapScreen)


async def test_the_practice_rig_leads_from_the_start_to_a_ranked_change(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Start screen, set-up, three blows each way, and the job is worked out and ranked."""
    monkeypatch.chdir(tmp_path)
    pace = StepPace()
    app = FieldkitApp()
    app.bench = bench_of(tmp_path, pace)
    async with app.run_test(size=(80, 24)) as pilot:
        await practising(pilot)
        screen = app.screen
        await struck(pilot, pace, 3)
        await pilot.press("d")
        await on_screen(pilot, FormWindow)
        await pilot.press("enter")
        await on_screen(pilot, TapScreen)
        await play(pilot, pace, lambda: screen.run.look().guide.phase == "listening")
        await struck(pilot, pace, 3)
        await pilot.press("s")
        await until(pilot, lambda: len(app.screen_stack) == 1)
        await settled(pilot)
        await until(pilot, lambda: not app.desk.working)
        assert app.here == "tap"
        assert app.desk.workup is not None
        assert app.desk.workup.simulated == ("tap-1.wav", "tap-2.wav")
        assert {mode.direction for mode in app.desk.workup.evidence.firm} == {"vertical", "lateral"}
        assert "◆ SIMULATED ◆" in text_of(app, "#job-title")
        assert "simulated, 3 of" in rows_of(app, "#blows")[0][1]
        await pilot.press("5")
        await pilot.pause()
        assert rows_of(app, "#fixes")[0][0] == "1"
        assert app.desk.workup.detuning is not None
        assert app.desk.workup.detuning.fixes[0].chance > 0.5
        await pilot.press("6")
        await pilot.pause()
        assert "SIMULATED: tap-1.wav, tap-2.wav came from the practice rig" in " ".join(
            text_of(app, "#sheet-text").split()
        )
    job = load_job(tmp_path / "practice.toml")
    assert [(one.direction, one.kind) for one in job.recordings] == [
        ("vertical", "tap"),
        ("lateral", "tap"),
    ]


async def test_ctrl_q_while_tapping_saves_into_the_job_and_ends_the_app(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    pace = StepPace()
    app = FieldkitApp()
    app.bench = bench_of(tmp_path, pace)
    async with app.run_test(size=(80, 24)) as pilot:
        await practising(pilot)
        await struck(pilot, pace, 1)
        await pilot.press("ctrl+q")
        await on_screen(pilot, AskScreen)
        await pilot.press("enter")
        await until(pilot, lambda: app._exit)
    assert [entry.path.name for entry in load_job(tmp_path / "practice.toml").recordings] == [
        "tap-1.wav"
    ]


async def test_practising_on_a_measured_job_goes_to_a_copy(job_path: Path, quick: None) -> None:
    """What was measured on a pipe stays out of it, and its own file is not touched."""
    before = job_path.read_bytes()
    app = FieldkitApp(job_path)
    app.bench = bench_of(job_path.parent, StepPace())
    async with opened(app) as pilot:
        await pilot.press("m")
        await on_screen(pilot, SetupScreen)
        await pilot.press("g")
        await until(pilot, lambda: any("what was measured stays out" in x for x in said(app)))
        await on_screen(pilot, TapScreen)
        await pilot.press("escape")
        await on_screen(pilot, SetupScreen)
        await pilot.press("escape")
        await until(pilot, lambda: len(app.screen_stack) == 1)
        assert app.open_job is not None
        assert app.open_job.path == job_path.with_name("job-practice.toml")
    assert job_path.read_bytes() == before
    copy = load_job(job_path.with_name("job-practice.toml"))
    assert copy.recordings == copy.measured == ()
    assert copy.title.endswith("(practice)")


async def test_an_input_is_refused_for_a_job_with_simulated_recordings(
    job_path: Path, quick: None
) -> None:
    simulated = RecordingInfo(
        "the practice rig", 8000, (ChannelSetup(),), "2026-01-01", simulated=True
    )
    write_info(job_path.parent / "tap-1.flac", simulated)
    app = FieldkitApp(job_path)
    app.bench = bench_of(job_path.parent, None, INTERFACE)
    async with opened(app) as pilot:
        await pilot.press("m")
        await on_screen(pilot, SetupScreen)
        await until(pilot, lambda: not app.screen.looking)  # type: ignore[attr-defined]
        await pilot.pause()
        await pilot.press("down", "g")
        await until(pilot, lambda: any("do not mix" in text for text in said(app)))
        await on_screen(pilot, SetupScreen)


async def test_m_asks_for_a_job_where_there_is_none(tmp_path: Path, quick: None) -> None:
    app = FieldkitApp()
    async with app.run_test(size=(80, 24)) as pilot:
        await on_screen(pilot, StartScreen)
        await pilot.press("escape", "m")
        await on_screen(pilot, PickScreen)
        assert app.screen.heading == "Measure for which job?"  # type: ignore[attr-defined]


async def test_recordings_join_the_job_which_is_saved_where_nothing_else_is_unsaved(
    job_path: Path, quick: None
) -> None:
    from fieldkit.ui.capture.flow import add

    takes = (
        Take(job_path.with_name("tap-7.wav"), (ChannelSetup(direction="lateral"),), "tap", 0, 4),
        Take(job_path.with_name("tap-8.wav"), (ChannelSetup(),), "tap", 9, 0),
    )
    app = FieldkitApp(job_path)
    async with opened(app) as pilot:
        assert add(app, Result(takes, add=True))
        await settled(pilot)
        assert app.open_job is not None
        assert not app.open_job.unsaved
        names = [entry.path.name for entry in load_job(job_path).recordings]
        assert "tap-7.wav" in names
        assert "tap-8.wav" not in names
        app.change_text(lambda: app.open_job.text.with_value("title", "Changed"))
        assert add(app, Result(takes[:1], add=True))
        assert app.open_job.unsaved
        await settled(pilot)
        assert any("ctrl+s saves it" in text for text in said(app))


async def test_a_real_input_is_recorded_through_the_app(
    job_path: Path, quick: None, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """PortAudio against a server without a sound card: listed, chosen, recorded, in the job."""
    require("pulseaudio", "pactl", "paplay")
    from fieldkit.capture.devices import list_inputs
    from tests.capture.rig import end_portaudio, pulse_bench

    with pulse_bench(tmp_path / "audio") as audio:
        for name, value in audio.environment.items():
            monkeypatch.setenv(name, value)
        try:
            app = FieldkitApp(job_path)
            app.wiring = Wiring("running", seconds=1.5)
            app.bench = Bench(list_inputs=list_inputs, presets_path=tmp_path / "presets.toml")
            async with opened(app) as pilot:
                await pilot.press("2", "m")
                await on_screen(pilot, SetupScreen)
                screen = app.screen
                assert isinstance(screen, SetupScreen)
                await until(pilot, lambda: not screen.looking)
                assert screen.inputs, screen.refused
                await pilot.press("down", "g")
                await until(pilot, lambda: len(app.screen_stack) == 1)
                await settled(pilot)
                assert app.here == "running"
        finally:
            end_portaudio()
    entry = load_job(job_path).recordings[-1]
    assert (entry.kind, entry.path.name) == ("running", "running-1.wav")
    import soundfile

    assert soundfile.info(str(entry.path)).duration == pytest.approx(1.5)
