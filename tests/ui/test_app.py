"""The views driven by keys alone, at both sizes, on a job whose results are written down."""

from __future__ import annotations

import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import pytest

from fieldkit import workup as chain
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.desk import STEPS, StepState
from fieldkit.ui.dialogs import TextScreen
from fieldkit.ui.strip import Step
from fieldkit.ui.widgets import FrequencyRuler
from tests.ui import glycol
from tests.ui.driving import SIZES, opened, rows_of, settled, text_of


def test_the_app_is_loaded_without_the_slow_libraries() -> None:
    """The first paint must not wait for them."""
    code = (
        "import sys, fieldkit.ui.app; "
        "print([m for m in ('scipy', 'pint', 'pydantic', 'fluids', 'tomlkit') if m in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


@pytest.mark.parametrize("size", SIZES)
async def test_each_number_key_shows_its_view_with_ruler_and_reading(
    app: FieldkitApp, size: tuple[int, int]
) -> None:
    async with opened(app, size) as pilot:
        for number, step in enumerate(STEPS, start=1):
            await pilot.press(str(number))
            await pilot.pause()
            view = app.view(step)
            assert view.display
            assert view.region.height >= 10
            assert app.focused is not None
            assert view in app.focused.ancestors
            assert app.query_one(FrequencyRuler).region.bottom < size[1]
            assert len(text_of(app, "#reading")) > 20


async def test_a_number_key_pressed_before_the_views_are_there_is_remembered(
    job_path: Path, quick: None
) -> None:
    class Late(FieldkitApp):
        async def go_on(self) -> None:
            """Not yet."""

    app = Late(job_path)
    async with app.run_test(size=(80, 24)) as pilot:
        await pilot.press("4")
        await FieldkitApp.go_on(app)
        await settled(pilot)
        assert app.view("match").display


async def test_the_strip_tells_the_state_of_each_step_in_a_word(app: FieldkitApp) -> None:
    async with opened(app):
        for step in app.query(Step):
            assert step.state is StepState.DONE
            assert "✓ done" in str(step.render())


async def test_measured_modes_stand_in_the_table_with_their_doubt(app: FieldkitApp) -> None:
    async with opened(app):
        assert rows_of(app, "#modes")[0] == ["23.41 ±0.02", "1.10 ±0.06", "vertical", "3"]
        assert ["    14.00 s", "✗ struck twice: another blow 0.3 s later"] in rows_of(app, "#blows")


async def test_what_was_not_accepted_is_listed_with_reasons(app: FieldkitApp) -> None:
    async with opened(app) as pilot:
        await pilot.press("x")
        await pilot.pause()
        assert isinstance(app.screen, TextScreen)
        assert "Seen in one tap of four only." in app.screen.text
        assert "50.00 Hz  A steady tone" in app.screen.text
        await pilot.press("escape")
        assert not isinstance(app.screen, TextScreen)


async def test_the_caution_before_striking_is_always_in_sight_and_full_on_a_key(
    app: FieldkitApp,
) -> None:
    async with opened(app) as pilot:
        assert "Ask the operator" in text_of(app, "#tap-caution")
        await pilot.press("c")
        await pilot.pause()
        assert isinstance(app.screen, TextScreen)
        assert "permit" in app.screen.text


async def test_arrow_keys_choose_the_mode_that_is_drawn(app: FieldkitApp) -> None:
    async with opened(app) as pilot:
        await pilot.press("3")
        await pilot.pause()
        assert "mode 1 of 3: 20.9 Hz vertical" in text_of(app, "#drawn")
        await pilot.press("right")
        await pilot.pause()
        assert "mode 2 of 3: 28.4 Hz lateral" in text_of(app, "#drawn")
        await pilot.press("m")
        await pilot.pause()
        assert "With change 1, running" in text_of(app, "#drawn")
        await pilot.press("m")
        await pilot.pause()
        assert "As tapped" in text_of(app, "#drawn")


@pytest.mark.parametrize("size", SIZES)
async def test_choosing_a_fix_changes_the_ruler_and_the_details(
    app: FieldkitApp, size: tuple[int, int]
) -> None:
    async with opened(app, size) as pilot:
        await pilot.press("5")
        await settled(pilot)
        ruler = app.query_one(FrequencyRuler)
        assert [median for _, median, _ in ruler.data.after] == [66.4, 71.9, 124.0]
        await pilot.press("down")
        await settled(pilot)
        assert [median for _, median, _ in ruler.data.after] == [36.2, 37.4, 93.0]
        assert "steel behind the clamp" in text_of(app, "#fix-text").lower()
        assert app.desk.chosen_modes


async def test_where_no_fix_is_enough_that_is_said(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    short = replace(glycol.DETUNING, fixes=glycol.FIXES[1:])
    monkeypatch.setattr(chain, "run", lambda job, *_: glycol.workup(job, detuning=short))
    async with opened(app) as pilot:
        await pilot.press("5")
        await settled(pilot)
        assert "No change reaches the 90 % wanted" in text_of(app, "#fix-text")


async def test_keys_are_listed_and_light_follows_dark(app: FieldkitApp) -> None:
    async with opened(app) as pilot:
        await pilot.press("question_mark")
        await pilot.pause()
        assert isinstance(app.screen, TextScreen)
        for line in ("Write the job file", "Draw the mode before", "Write the whole sheet"):
            assert line in app.screen.text
        await pilot.press("escape")
        await pilot.pause()
        await pilot.press("t")
        assert app.theme == "textual-light"


async def test_the_palette_offers_every_command(app: FieldkitApp) -> None:
    async with opened(app):
        names = {command.title for command in app.get_system_commands(app.screen)}
        assert {"Detune", "Save as", "Sample job", "Stop", "Keys"} <= names


async def test_the_answer_is_told_at_the_top_of_every_view(app: FieldkitApp) -> None:
    """Whoever has not found the way to Detune yet is pointed there."""
    async with opened(app) as pilot:
        for key in "123456":
            await pilot.press(key)
            assert "press 5" in text_of(app, "#activity")
