"""Opening, saving, leaving, and the samples."""

from __future__ import annotations

from pathlib import Path

import pytest
from textual.widgets import Button, Input, Static

from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.broken_screen import BrokenScreen
from fieldkit.ui.dialogs import AskScreen, PathScreen
from fieldkit.ui.start.guided import GuidedScreen
from fieldkit.ui.start.picker import FilePicker
from fieldkit.ui.start.start_screen import StartScreen
from fieldkit.ui.table import Table
from tests.ui.driving import (
    change_something,
    choose_row,
    fill,
    opened,
    rows_of,
    said,
    settled,
    text_of,
    until,
)
from tests.ui.job_text import JOB_TEXT


async def test_save_writes_the_file(app: FieldkitApp, job_path: Path) -> None:
    async with opened(app) as pilot:
        await choose_row(pilot, "leg.0")
        await pilot.press("enter")
        await pilot.pause()
        await fill(pilot, length="4.4 m")
        await pilot.press("enter")
        await settled(pilot)
        await pilot.press("ctrl+s")
        await settled(pilot)
        assert 'length = "4.4 m"' in job_path.read_text(encoding="utf-8")
        assert app.open_job is not None
        assert not app.open_job.unsaved


async def test_save_as_goes_on_with_the_new_file(app: FieldkitApp, tmp_path: Path) -> None:
    async with opened(app) as pilot:
        await pilot.press("S")
        await pilot.pause()
        assert isinstance(app.screen, PathScreen)
        app.screen.query_one(Input).value = str(tmp_path / "other.toml")
        await pilot.press("enter")
        await settled(pilot)
        assert (tmp_path / "other.toml").exists()
        assert app.open_job is not None
        assert app.open_job.path == tmp_path / "other.toml"


async def test_a_place_that_cannot_be_written_is_one_sentence(
    app: FieldkitApp, tmp_path: Path
) -> None:
    async with opened(app) as pilot:
        await pilot.press("S")
        await pilot.pause()
        app.screen.query_one(Input).value = str(tmp_path / "no" / "such" / "job.toml")
        await pilot.press("enter")
        await settled(pilot)
        assert "cannot be written" in said(app)[-1]


async def test_quit_asks_when_something_is_unsaved(app: FieldkitApp) -> None:
    async with opened(app) as pilot:
        await change_something(pilot)
        await pilot.press("q")
        await pilot.pause()
        assert isinstance(app.screen, AskScreen)
        await pilot.press("escape")
        await settled(pilot)
        assert app.is_running
        assert not isinstance(app.screen, AskScreen)


async def test_quit_can_save_first(app: FieldkitApp, job_path: Path) -> None:
    async with opened(app) as pilot:
        await change_something(pilot)
        await pilot.press("q")
        await pilot.pause()
        app.screen.query_one("#save", Button).press()
        await pilot.pause()
    assert "Another title" in job_path.read_text(encoding="utf-8")
    assert app.return_code == 0


async def test_quit_leaves_at_once_when_all_is_saved(app: FieldkitApp) -> None:
    async with opened(app) as pilot:
        await pilot.press("q")
        await pilot.pause()
    assert app.return_code == 0


async def test_a_file_that_is_no_job_is_one_sentence(tmp_path: Path, quick: None) -> None:
    path = tmp_path / "job.toml"
    path.write_text("title = 3 metres", encoding="utf-8")
    app = FieldkitApp(path)
    async with opened(app) as pilot:
        await until(pilot, lambda: isinstance(app.screen, BrokenScreen))
        assert app.desk.job is None
        assert app.screen.heading == str(path)  # type: ignore[attr-defined]
        assert "No job is open" in text_of(app, "#reading")
        assert "▶    1  title = 3 metres" in str(app.screen.query_one("#excerpt", Static).render())
        await pilot.press("escape")
        await until(pilot, lambda: isinstance(app.screen, StartScreen))


async def test_without_a_job_the_app_offers_a_start(quick: None) -> None:
    app = FieldkitApp()
    async with opened(app) as pilot:
        assert isinstance(app.screen, StartScreen)
        await pilot.press("enter")
        await settled(pilot)
        assert isinstance(app.screen, GuidedScreen)


async def test_samples_are_copied_out_and_one_is_opened(
    tmp_path: Path, job_path: Path, quick: None, monkeypatch: pytest.MonkeyPatch
) -> None:
    asked: list[Path] = []

    def copy(folder: Path) -> tuple[Path, ...]:
        asked.append(folder)
        return (job_path,)

    monkeypatch.setattr("fieldkit.cli.samples.copy_samples", copy)
    app = FieldkitApp()
    async with opened(app) as pilot:
        await pilot.press("s")
        await until(pilot, lambda: isinstance(app.screen, PathScreen))
        app.screen.query_one(Input).value = str(tmp_path / "samples")
        await pilot.press("enter")
        await pilot.pause()
        await pilot.press("enter")
        await settled(pilot)
        assert asked == [tmp_path / "samples"]
        assert app.desk.job is not None


async def test_open_lists_the_folder_and_completes_a_path(app: FieldkitApp, job_path: Path) -> None:
    async with opened(app) as pilot:
        await pilot.press("o")
        await pilot.pause()
        assert isinstance(app.screen, FilePicker)
        typed = app.screen.query_one(Input)
        typed.value = str(job_path)[:-3]
        await until(pilot, lambda: app.screen.query_one(Table).row_count == 1)
        await pilot.press("tab")
        assert typed.value == str(job_path)
        await pilot.press("enter")
        await settled(pilot)
        assert app.desk.workup is not None


async def test_markup_and_control_codes_in_a_job_are_plain_text(
    tmp_path: Path, quick: None
) -> None:
    path = tmp_path / "job.toml"
    hostile = "[red]\\u001b[31mtitle[/]"
    path.write_text(JOB_TEXT.replace("Glycol booster, discharge line", hostile), encoding="utf-8")
    app = FieldkitApp(path)
    async with opened(app) as pilot:
        await pilot.press("3")
        await pilot.pause()
        assert "[red]\\u001b[31mtitle[/]" in text_of(app, "#job-title")
        assert rows_of(app, "#rows")[0][1].startswith("[red]\\u001b")
        assert "\x1b" not in app.export_screenshot()
