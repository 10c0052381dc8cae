"""The app on the made-up job: no solver, no signal processing, the same every time."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from fieldkit import workup as chain
from fieldkit.job.document import Job
from fieldkit.progress import Progress
from fieldkit.signal import recording
from fieldkit.ui.app import FieldkitApp
from tests.ui import glycol
from tests.ui.job_text import JOB_TEXT

Run = Callable[[Job, Progress], chain.Workup]


@pytest.fixture(autouse=True)
def state_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Recent jobs and unsaved work of the test alone; empty at its start."""
    home = tmp_path / "state"
    monkeypatch.setattr("fieldkit.job.folders.state_folder", lambda: home)
    for module in ("recent", "journal"):
        monkeypatch.setattr(f"fieldkit.job.{module}.state_folder", lambda: home)
    return home


@pytest.fixture
def job_path(tmp_path: Path) -> Path:
    """The made-up job on the disk."""
    path = tmp_path / "job.toml"
    path.write_text(JOB_TEXT, encoding="utf-8")
    return path


@pytest.fixture
def quick(monkeypatch: pytest.MonkeyPatch) -> None:
    """Results come from the made-up workup instead of the solver."""

    def run(job: Job, progress: Progress, _on_part: object) -> chain.Workup:
        progress.step("tap", 0.0)
        return glycol.workup(job)

    monkeypatch.setattr(chain, "run", run)
    monkeypatch.setattr(chain, "state_modes", lambda _job, _progress: glycol.states())
    monkeypatch.setattr("fieldkit.span.modes.span_modes", lambda *_: glycol.states()[1].modes)
    monkeypatch.setattr(recording, "load", lambda _path, rate_hz=None: None)
    monkeypatch.setattr(recording, "channel_signal", lambda _recording, _channel: decay())


def decay() -> np.ndarray:
    """Samples of the made-up tap recording."""
    return glycol.decay()[0]


@pytest.fixture
def app(job_path: Path, quick: None) -> FieldkitApp:
    """The app about to open the made-up job."""
    return FieldkitApp(job_path)
