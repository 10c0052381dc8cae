"""Changing the job through forms and adopted fixes."""

from __future__ import annotations

import pytest
from textual.widgets import Static

from fieldkit.errors import Refusal
from fieldkit.job.store import JobText
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.dialogs import AskScreen, PickScreen
from fieldkit.ui.forms.window import FieldRow, FormWindow
from tests.ui.driving import SIZES, choose_row, fill, opened, rows_of, said, settled, text_of


@pytest.mark.parametrize("size", SIZES)
async def test_a_support_gets_another_stiffness(app: FieldkitApp, size: tuple[int, int]) -> None:
    async with opened(app, size) as pilot:
        await choose_row(pilot, "support.1")
        await pilot.press("enter")
        await pilot.pause()
        assert isinstance(app.screen, FormWindow)
        await fill(pilot, vertical="3.5 MN/m")
        await pilot.press("enter")
        await settled(pilot)
        assert app.desk.job is not None
        assert app.desk.job.span.supports[1].vertical == 3.5e6
        assert app.open_job is not None
        assert app.open_job.unsaved
        assert "unsaved" in text_of(app, "#job-title")
        assert any("vertical 3.5 MN/m" in row[1] for row in rows_of(app, "#rows"))


async def test_a_bad_quantity_shows_its_sentence_and_does_not_leave_the_form(
    app: FieldkitApp,
) -> None:
    async with opened(app) as pilot:
        await choose_row(pilot, "support.1")
        await pilot.press("e")
        await pilot.pause()
        await fill(pilot, vertical="3.5 MN")
        await pilot.press("enter")
        await pilot.pause()
        assert isinstance(app.screen, FormWindow)
        says = str(app.screen.query_one("#form-says", Static).render())
        assert "'3.5 MN' is not a stiffness" in says
        await pilot.press("escape")
        await pilot.pause()
        assert app.open_job is not None
        assert not app.open_job.unsaved


async def test_a_value_is_shown_as_understood_while_it_is_typed(app: FieldkitApp) -> None:
    async with opened(app) as pilot:
        await choose_row(pilot, "mass.0")
        await pilot.press("enter")
        await pilot.pause()
        await fill(pilot, mass="50 lb")
        row = next(row for row in app.screen.query(FieldRow) if row.field.key == "mass")
        assert "22.7 kg" in str(row.query_one(".field-says", Static).render())


async def test_what_fits_a_field_but_not_the_job_is_told_in_the_form(app: FieldkitApp) -> None:
    async with opened(app) as pilot:
        await choose_row(pilot, "mass.0")
        await pilot.press("enter")
        await pilot.pause()
        await fill(pilot, at="60 m")
        await pilot.press("enter")
        await pilot.pause()
        assert isinstance(app.screen, FormWindow)
        assert "outside the span" in str(app.screen.query_one("#form-says", Static).render())


@pytest.mark.parametrize("size", SIZES)
async def test_a_mass_is_added_removed_and_had_back(
    app: FieldkitApp, size: tuple[int, int]
) -> None:
    async with opened(app, size) as pilot:
        await choose_row(pilot, "mass.0")
        await pilot.press("a")
        await pilot.pause()
        await fill(pilot, at="1 m", mass="7 kg", name="gauge")
        await pilot.press("enter")
        await settled(pilot)
        assert [m.mass_kg for m in app.desk.job.span.masses] == [24.0, 7.0]
        await choose_row(pilot, "mass.0")
        await pilot.press("d")
        await pilot.pause()
        assert isinstance(app.screen, AskScreen)
        await pilot.press("enter")
        await settled(pilot)
        assert [m.name for m in app.desk.job.span.masses] == ["gauge"]
        await pilot.press("u")
        await settled(pilot)
        assert len(app.desk.job.span.masses) == 2


async def test_a_new_part_is_asked_for_by_kind_where_the_cursor_says_nothing(
    app: FieldkitApp,
) -> None:
    async with opened(app) as pilot:
        await choose_row(pilot, "pipe.None")
        await pilot.press("a")
        await pilot.pause()
        assert isinstance(app.screen, PickScreen)
        await pilot.press("enter")
        await pilot.pause()
        assert isinstance(app.screen, FormWindow)
        assert app.screen.form.table == "support"


async def test_the_pipe_cannot_be_removed(app: FieldkitApp) -> None:
    async with opened(app) as pilot:
        await choose_row(pilot, "pipe.None")
        await pilot.press("d")
        await pilot.pause()
        assert not isinstance(app.screen, AskScreen)
        assert "changed, not removed" in said(app)[-1]


async def test_a_fix_is_adopted_only_after_asking(app: FieldkitApp) -> None:
    async with opened(app) as pilot:
        await pilot.press("5")
        await settled(pilot)
        await pilot.press("a")
        await pilot.pause()
        assert isinstance(app.screen, AskScreen)
        await pilot.press("escape")
        await settled(pilot)
        assert len(app.desk.job.span.supports) == 3
        await pilot.press("a")
        await pilot.pause()
        await pilot.press("enter")
        await settled(pilot)
        assert app.desk.job.span.supports[3].vertical == 4e6
        assert app.desk.job.recordings_of("tap") == ()
        assert len(app.desk.job.recordings_of("running")) == 1


async def test_a_fix_can_be_adopted_with_the_taps_kept(app: FieldkitApp) -> None:
    async with opened(app) as pilot:
        await pilot.press("5")
        await settled(pilot)
        await pilot.press("a")
        await pilot.pause()
        await pilot.press("right", "enter")
        await settled(pilot)
        assert app.desk.job.span.supports[3].vertical == 4e6
        assert len(app.desk.job.recordings_of("tap")) == 1


async def test_a_fix_that_a_job_file_cannot_hold_is_one_sentence(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    def refuse(_text: JobText, _change: object) -> JobText:
        raise Refusal("a job file cannot hold this change", "build it and tap again")

    monkeypatch.setattr(JobText, "with_change", refuse)
    async with opened(app) as pilot:
        await pilot.press("5")
        await settled(pilot)
        await pilot.press("a")
        await pilot.pause()
        await pilot.press("enter")
        await settled(pilot)
        assert said(app)[-1] == "a job file cannot hold this change; build it and tap again"
