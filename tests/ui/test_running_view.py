"""The Running view: modes seen without a tap beside the lines, or why there are none."""

from __future__ import annotations

from dataclasses import replace

import pytest

from fieldkit import workup as chain
from fieldkit.job.document import Job
from fieldkit.progress import Progress
from fieldkit.signal.modes import MeasuredMode, ModeEstimate, RefusedMode, Tone
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.dialogs import TextScreen
from fieldkit.ui.table import Table
from fieldkit.ui.widgets import SpectrumPlot
from tests.ui import glycol
from tests.ui.driving import opened, rows_of, settled, text_of

SEEN = ModeEstimate(
    (
        MeasuredMode(20.9, 0.06, 0.013, 0.003, state="running", source="running"),
        MeasuredMode(28.4, 0.1, 0.011, 0.002, state="running", source="running"),
    ),
    (Tone(49.1, 1.0),),
    (RefusedMode(66.0, "not seen in both halves of the record"),),
)


def read_as(monkeypatch: pytest.MonkeyPatch, modes: ModeEstimate | None, reason: str) -> None:
    """The made-up running recording with these modes."""

    def run(job: Job, _progress: Progress, _on_part: object) -> chain.Workup:
        whole = glycol.workup(job)
        running = tuple(replace(r, modes=modes, no_modes=reason) for r in whole.running)
        evidence = chain.with_running_modes(whole.evidence, running)
        return replace(whole, running=running, evidence=evidence)

    monkeypatch.setattr(chain, "run", run)


async def test_modes_seen_running_are_marked_and_listed_with_their_doubt(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    """As in the Tap view, and called what they are; the Tap view keeps to the taps."""
    read_as(monkeypatch, SEEN, "")
    async with opened(app, (120, 40)) as pilot:
        await pilot.press("2")
        await settled(pilot)
        rows = rows_of(app, "#seen")
        assert rows == [["20.90 ±0.06", "1.3 ±0.3"], ["28.40 ±0.10", "1.1 ±0.2"]]
        assert "weaker evidence than a tap" in text_of(app, "#running-text")
        marks = app.query_one("#running-spectrum", SpectrumPlot).data.marks
        assert [m.frequency_hz for m in marks if m.label == "seen"] == [20.9, 28.4]
        assert len(rows_of(app, "#modes")) == len(glycol.MODES)


async def test_what_is_no_mode_stands_under_x_with_its_reason(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Refused peaks and machine lines."""
    read_as(monkeypatch, SEEN, "")
    async with opened(app) as pilot:
        await pilot.press("2")
        await pilot.press("x")
        await pilot.pause()
        assert isinstance(app.screen, TextScreen)
        assert "66.00 Hz  Not seen in both halves" in app.screen.text
        assert "49.10 Hz  A machine line" in app.screen.text


async def test_without_modes_the_reason_is_said_and_the_lines_get_the_room(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    """No empty table."""
    read_as(monkeypatch, None, "24 s of running record are too short")
    async with opened(app, (120, 40)) as pilot:
        await pilot.press("2")
        await settled(pilot)
        assert "No mode seen: 24 s of running record are too short." in text_of(
            app, "#running-text"
        )
        assert not app.query_one("#seen", Table).display
