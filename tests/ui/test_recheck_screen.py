"""Recheck on screen: recordings are asked for one by one, the verdict comes, the window closes."""

from __future__ import annotations

from pathlib import Path

import pytest
from textual.widgets import Input, Static

from fieldkit.detune.excitation import bands
from fieldkit.detune.recheck_answer import (
    FAILED,
    AsFound,
    PromisedMode,
    Reason,
    Recheck,
    RunningMode,
)
from fieldkit.errors import Refusal
from fieldkit.progress import Progress
from fieldkit.signal.modes import MeasuredMode
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.dialogs import PathScreen, TextScreen
from fieldkit.ui.recheck_screen import RecheckScreen, ruler_of
from fieldkit.ui.widgets import FrequencyRuler
from fieldkit.workup import rechecking
from fieldkit.workup.rechecking import Rechecked
from tests.ui import glycol
from tests.ui.driving import SIZES, opened, settled

MEASURED = MeasuredMode(55.0, 0.05, 0.01, 0.001, "vertical", 4, 1.0)
ANSWER = Recheck(
    change=glycol.FIXES[0].change,
    summary="add a clamp at 1.60 m: 4.0 MN/m vertical and lateral",
    state="tapped",
    same_state=False,
    promised=(
        PromisedMode("vertical", 63.0, 66.4, 69.7, MEASURED),
        PromisedMode("lateral", 68.3, 71.9, 75.5, None),
    ),
    unexplained=(),
    running=(
        RunningMode("vertical", 49.0, 50.1, 51.2, 55.0, 0.1, 0.02, "pump 2x", 0.005),
        RunningMode("lateral", 60.0, 66.0, 72.0, None, 0.2, 0.96, "pump 2x", 0.32),
    ),
    bands_measured=bands((glycol.PUMP, glycol.RIPPLE), 0.1),
    margin=0.2,
    margin_measured=0.1,
    chance_before=0.97,
    chance_now=0.01,
    verdict=FAILED,
    because="the vertical mode measured at 55.0 Hz runs at 50.1 Hz, 1 % from pump 2x",
    measure_next="",
    ways=(("stiffness", 0.93), ("as drawn", 0.07)),
    found=(AsFound("vertical", "N/m", 4e6, 0.6e6, 0.8e6, 1.1e6, informed=True),),
    reasons=(
        Reason("stiffness", 0.93, "the [b]support[/b] is less stiff than drawn", "look at it"),
    ),
    effective_members=120.0,
    span_now=glycol.SPAN,
    mended=None,
    next_fixes=glycol.DETUNING,
)  # fmt: skip


@pytest.fixture
def rechecks(monkeypatch: pytest.MonkeyPatch) -> list[tuple[str, ...]]:
    """Answers as written above; the files it was asked about."""
    asked: list[tuple[str, ...]] = []

    def made(work, fix, found, state, progress: Progress) -> Rechecked:
        asked.append(tuple(entry.path.name for entry in found.entries))
        progress.step("drawing the ensemble", 0.5)
        return Rechecked(work, fix, found, state, ANSWER)

    monkeypatch.setattr(rechecking, "rechecked", made)
    return asked


def words(app: FieldkitApp, name: str) -> str:
    return str(app.screen.query_one(name, Static).render())


async def name_files(pilot, *paths: Path) -> None:
    """Go to Detune, ask for a recheck, name the recordings, and no more."""
    await pilot.press("5")
    await pilot.press("p")
    await pilot.pause()
    for path in paths:
        assert isinstance(pilot.app.screen, PathScreen)
        pilot.app.screen.query_one(Input).value = str(path)
        await pilot.press("enter")
        await pilot.pause()
    await pilot.press("escape")
    await pilot.pause()
    await settled(pilot)


def after(folder: Path, *names: str) -> list[Path]:
    paths = [folder / name for name in names]
    for path in paths:
        path.write_bytes(b"")
    return paths


@pytest.mark.parametrize("size", SIZES)
async def test_recordings_go_in_and_the_verdict_comes_out(app, quick, rechecks, tmp_path, size):
    async with opened(app, size) as pilot:
        await name_files(pilot, *after(tmp_path, "one.wav", "two.wav"))
        assert isinstance(app.screen, RecheckScreen)
        assert rechecks == [("one.wav", "two.wav")]
        assert "It did not work: the vertical mode" in words(app, "#recheck-verdict")
        text = words(app, "#recheck-text")
        assert "OUTSIDE" in text
        assert "not seen" in text
        assert "Next change" in text
        assert "[b]support[/b]" in text
        tables = [line for line in text.splitlines() if "OUTSIDE" in line or "pump" in line]
        assert max(len(line) for line in tables[:4]) <= size[0] - 6
        ruler = app.screen.query_one("#recheck-ruler", FrequencyRuler)
        assert ruler.display
        assert ruler.data.names[2] == "promised"
        await pilot.press("escape")
        assert not isinstance(app.screen, RecheckScreen)


async def test_a_refusal_is_told_in_the_window(app, quick, monkeypatch, tmp_path):
    def refused(*_: object) -> Rechecked:
        raise Refusal("no usable tap in one.wav", "record three taps or more")

    monkeypatch.setattr(rechecking, "rechecked", refused)
    async with opened(app) as pilot:
        await name_files(pilot, *after(tmp_path, "one.wav"))
        assert "record three taps or more." in words(app, "#recheck-verdict")
        assert not app.screen.query_one("#recheck-ruler").display


async def test_without_a_recording_nothing_happens(app, quick, rechecks):
    async with opened(app) as pilot:
        await name_files(pilot)
        assert not isinstance(app.screen, RecheckScreen)
        assert rechecks == []


async def test_without_ranked_changes_it_says_what_it_needs(app, quick, rechecks):
    async with opened(app) as pilot:
        app.put(workup=None, chosen=None)
        await pilot.press("5")
        await pilot.press("p")
        await pilot.pause()
        assert isinstance(app.screen, TextScreen)


def test_the_ruler_shows_what_was_carried_over_against_what_was_promised():
    """Measured modes where they run now; bands with the margin of a measured mode."""
    shown = ruler_of(ANSWER, glycol.FIXES[0], 200.0)
    assert shown.measured_hz == [50.1]
    assert len(shown.now) == 2
    assert shown.after[0] == (glycol.FIXES[0].modes_after[0].low_hz, 66.4, pytest.approx(69.72))
    assert shown.bands[0].avoid_low_hz == pytest.approx(0.9 * 1450 / 60)
