"""A running recording on the practice rig, and the reference shaker, by keys."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
from textual.widgets import Static

from fieldkit.capture.setup import ChannelSetup
from fieldkit.job.store import JobText
from fieldkit.ui.capture import calibration_run
from fieldkit.ui.capture.bench import Bench
from fieldkit.ui.capture.calibration_run import Calibrated
from fieldkit.ui.capture.calibration_screen import CalibrationScreen
from fieldkit.ui.capture.running_run import RunningRun
from fieldkit.ui.capture.running_screen import RunningScreen
from fieldkit.ui.capture.takes import Result, with_takes
from fieldkit.ui.capture.wiring import Wiring
from fieldkit.ui.widgets import SpectrumPlot
from tests.ui import glycol
from tests.ui.capturing import CHANNEL, Host, StepPace, play, rig, until
from tests.ui.job_text import JOB_TEXT

WIRING = Wiring("running", rig_setups=(CHANNEL,), seconds=3.0, speeds_hz={"pump": 1480 / 60})


def begun(folder: Path, pace: StepPace) -> RunningRun:
    return RunningRun(rig(pace), (CHANNEL,), WIRING, glycol.job(), folder / "job.toml")


async def test_a_running_recording_has_its_length_and_its_speed(tmp_path: Path) -> None:
    """Order lines are laid over, it ends by itself, and the job notes the speed."""
    pace = StepPace()
    app = Host(lambda: RunningScreen(lambda: begun(tmp_path, pace), "Beam"))
    async with app.run_test(size=(80, 24)) as pilot:
        screen = app.screen
        assert isinstance(screen, RunningScreen)
        plot = screen.query_one(SpectrumPlot)
        await until(pilot, lambda: screen.run is not None)
        await play(pilot, pace, lambda: bool(plot.data.marks))
        assert [mark.label for mark in plot.data.marks] == ["pump 1x", "pump 2x", "pump 6x"]
        assert plot.data.marks[1].frequency_hz == pytest.approx(2 * 1480 / 60)
        assert "left of 3.0 s" in str(screen.query_one("#side", Static).render())
        assert "SIMULATED" in str(screen.query_one("#live-title", Static).render())
        await play(pilot, pace, lambda: app.result is not None)
    result = app.result
    assert isinstance(result, Result)
    assert result.add
    text = with_takes(JobText(JOB_TEXT, tmp_path / "job.toml"), result.useful)
    entry = text.job().recordings_of("running")[-1]
    assert entry.path.name == "running-1.wav"
    assert "# running-1.wav: pump at 1480 rpm" in text.text


async def test_leaving_at_once_keeps_nothing(tmp_path: Path) -> None:
    app = Host(lambda: RunningScreen(lambda: begun(tmp_path, StepPace()), "Beam"))
    async with app.run_test(size=(80, 24)) as pilot:
        await until(pilot, lambda: app.screen.run is not None)  # type: ignore[attr-defined]
        await pilot.press("escape")
        await until(pilot, lambda: app.result is not None)
    assert isinstance(app.result, Result)
    assert app.result.again
    assert not list(tmp_path.iterdir())


async def test_a_shaker_measures_the_sensitivity(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Refused while the sensor hears something else; then taken with date and result."""
    pace = StepPace()
    source = rig(pace)
    monkeypatch.setattr(calibration_run, "source_of", lambda *_: source)
    wiring = Wiring("tap", rig_setups=(ChannelSetup(full_scale="0.7 V", sensitivity="100 mV/g"),))
    job = glycol.job()
    app = Host(lambda: CalibrationScreen(wiring, 0, job, Bench(pace=pace)))
    async with app.run_test(size=(80, 24)) as pilot:
        screen = app.screen
        assert isinstance(screen, CalibrationScreen)
        await until(pilot, lambda: screen.run is not None)

        def says() -> str:
            return str(screen.query_one("#calibration-result", Static).render())

        source.shake(None)
        await play(pilot, pace, lambda: "No result" in says())
        await pilot.press("enter")
        await pilot.pause()
        assert app.result is None
        source.shake(10.0)
        await play(pilot, pace, lambda: "✓" in says())
        assert "steady to" in says()
        await pilot.press("enter")
        await until(pilot, lambda: app.result is not None)
    found = app.result
    assert isinstance(found, Calibrated)
    assert found.simulated
    full_scale = found.wiring.rig_setups[0].si_per_unit
    assert full_scale == pytest.approx(68.6, rel=2e-3)  # of the rig, m/s^2
    assert found.wiring.setups == wiring.setups
    assert "simulated by the practice rig" in found.comment
    assert replace(found, simulated=False).comment.endswith("through the practice rig")
