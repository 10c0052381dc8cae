"""One picture per view at both sizes, on results that are written down and never computed."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from textual.pilot import Pilot

from fieldkit.job.store import JobText
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.desk import STEPS
from fieldkit.ui.document import OpenJob
from tests.ui import glycol
from tests.ui.job_text import JOB_TEXT

SIZES = [(80, 24), (120, 40)]


class StillApp(FieldkitApp):
    """The app with the made-up results already on its desk, and no thread at all."""

    def open_or_ask(self) -> None:
        """Lay the results out."""
        text = JobText(JOB_TEXT, Path("job.toml"))
        job = text.job()
        samples: dict[object, np.ndarray] = {
            entry: glycol.decay()[0] for entry in job.recordings_of("tap")
        }
        self.open_job = OpenJob(text, text)
        self.put(
            job=job,
            text=text,
            workup=glycol.workup(job),
            states=glycol.states(),
            traces=samples,
            chosen=glycol.FIXES[0],
            chosen_modes=glycol.states()[1].modes,
        )

    def welcome(self) -> None:
        """The job is there already."""

    def shape_fix(self, *_: object) -> None:
        """The shapes lie on the desk already."""


ADVICE = [
    "Glycol booster, discharge line",
    "",
    "Is it a resonance?",
    "  The vertical mode at 20.9 Hz lies in reach of pump 1x (24.2 to 24.9 Hz).",
    "",
    "What to change",
    "  Add a clamp at 1.6 m, 4 MN/m both ways. Chance: 97 %.",
]


@pytest.fixture(autouse=True)
def _fixed_advice(monkeypatch: pytest.MonkeyPatch) -> None:
    """What the sheet says is the sheet's to test."""
    monkeypatch.setattr("fieldkit.sheet.advice.lines", lambda _workup: ADVICE)


@pytest.mark.parametrize("size", SIZES, ids=["80x24", "120x40"])
@pytest.mark.parametrize("view", STEPS)
def test_the_view_looks_as_it_did(
    snap_compare: Callable[..., bool], view: str, size: tuple[int, int]
) -> None:
    async def go(pilot: Pilot[None]) -> None:
        await pilot.press(str(STEPS.index(view) + 1))
        assert isinstance(pilot.app, FieldkitApp)
        while pilot.app.desk.job is None:
            await pilot.pause()
        await pilot.pause()

    assert snap_compare(StillApp(), terminal_size=size, run_before=go)
