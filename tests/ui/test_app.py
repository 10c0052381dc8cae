"""The app driven by keys alone, at both sizes, on a job whose results are written down."""

from __future__ import annotations

import subprocess
import sys
import threading
from collections.abc import AsyncIterator, Callable
from contextlib import asynccontextmanager
from dataclasses import replace
from pathlib import Path

import pytest
from textual.pilot import Pilot
from textual.widgets import Button, Input, Static

from fieldkit import workup as chain
from fieldkit.errors import Refusal
from fieldkit.job.document import Job
from fieldkit.job.store import JobText
from fieldkit.progress import Progress
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.desk import STEPS, StepState
from fieldkit.ui.dialogs import AskScreen, PathScreen, PickScreen, TextScreen
from fieldkit.ui.forms.window import FieldRow, FormWindow
from fieldkit.ui.strip import Step
from fieldkit.ui.table import Table
from fieldkit.ui.widgets import FrequencyRuler
from tests.ui import glycol

SIZES = [(80, 24), (120, 40)]


@asynccontextmanager
async def opened(app: FieldkitApp, size: tuple[int, int] = (80, 24)) -> AsyncIterator[Pilot[None]]:
    """The app with its job read and worked out."""
    async with app.run_test(size=size) as pilot:
        await settled(pilot)
        yield pilot


async def settled(pilot: Pilot[None]) -> None:
    """Every thread done and every message of it handled."""
    app = pilot.app
    for _ in range(4):
        await pilot.pause()
        threads = [w for w in app.workers if w._thread_worker and not w.is_finished]
        if wanted := [worker for worker in threads if not worker.is_cancelled]:
            await app.workers.wait_for_complete(wanted)
    await pilot.pause()


async def fill(pilot: Pilot[None], **texts: str) -> None:
    """Type into the fields of the form on screen."""
    for row in pilot.app.screen.query(FieldRow):
        if row.field.key in texts:
            row.query_one(Input).value = texts[row.field.key]
    await pilot.pause()


def text_of(app: FieldkitApp, selector: str) -> str:
    return str(app.screen_stack[0].query_one(selector, Static).render())


def rows_of(app: FieldkitApp, selector: str) -> list[list[str]]:
    table = app.screen_stack[0].query_one(selector, Table)
    return [[cell.plain for cell in table.get_row_at(i)] for i in range(table.row_count)]


def said(app: FieldkitApp) -> list[str]:
    return [notification.message for notification in app._notifications]


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


async def choose_row(pilot: Pilot[None], key: str) -> None:
    await pilot.press("3")
    await pilot.pause()
    pilot.app.query_one("#rows", Table).choose(key)
    await pilot.pause()


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


async def test_where_no_fix_is_enough_that_is_said(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    short = replace(glycol.DETUNING, fixes=glycol.FIXES[1:])
    monkeypatch.setattr(chain, "run", lambda job, _: glycol.workup(job, detuning=short))
    async with opened(app) as pilot:
        await pilot.press("5")
        await settled(pilot)
        assert "No change reaches the 90 % wanted" in text_of(app, "#fix-text")


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


async def change_something(pilot: Pilot[None]) -> None:
    app = pilot.app
    assert isinstance(app, FieldkitApp)
    assert app.open_job is not None
    text = app.open_job.text
    app.change_text(lambda: text.with_value("title", "Another title"))
    await settled(pilot)


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


class Slow:
    """A chain that waits at its second step until it is let go."""

    def __init__(self) -> None:
        self.started = threading.Event()
        self.go = threading.Event()

    def __call__(self, job: Job, progress: Progress) -> chain.Workup:
        progress.step("tap", 0.1)
        self.started.set()
        self.go.wait(20)
        progress.step("match", 0.6)
        return glycol.workup(job)


async def until(pilot: Pilot[None], wanted: Callable[[], bool]) -> None:
    """Handle messages until something holds."""
    for _ in range(500):
        if wanted():
            return
        await pilot.pause(0.01)
    raise AssertionError("it never came")


async def test_escape_stops_the_work_and_says_so(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    slow = Slow()
    monkeypatch.setattr(chain, "run", slow)
    async with app.run_test(size=(80, 24)) as pilot:
        await until(pilot, slow.started.is_set)
        await until(pilot, lambda: "esc stops" in text_of(app, "#activity"))
        assert app.query_one("#step-match", Step).state is StepState.WORKING
        app.query_one("#tap-spectrum").focus()
        await pilot.press("escape")
        slow.go.set()
        await until(pilot, lambda: app.desk.stopped)
        assert app.desk.workup is None
        assert app.query_one("#step-match", Step).state is StepState.STOPPED
        assert text_of(app, "#activity") == ""


async def test_a_result_that_comes_too_late_is_dropped(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    """An edit while the chain runs: only the result for the edited job is shown."""
    slow = Slow()
    monkeypatch.setattr(chain, "run", slow)
    async with app.run_test(size=(80, 24)) as pilot:
        await until(pilot, slow.started.is_set)
        monkeypatch.setattr(chain, "run", lambda job, _: glycol.workup(job))
        await change_something(pilot)
        slow.go.set()
        await until(pilot, lambda: app.desk.workup is not None)
        await settled(pilot)
        assert app.desk.workup is not None
        assert app.desk.workup.job.title == "Another title"


async def test_escape_closes_a_window_and_leaves_the_work_alone(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    slow = Slow()
    monkeypatch.setattr(chain, "run", slow)
    async with app.run_test(size=(80, 24)) as pilot:
        await until(pilot, slow.started.is_set)
        await pilot.press("question_mark")
        await pilot.pause()
        await pilot.press("escape")
        await pilot.pause()
        assert not isinstance(app.screen, TextScreen)
        slow.go.set()
        await until(pilot, lambda: app.desk.workup is not None)
        await settled(pilot)


async def test_a_fault_in_the_chain_is_a_sentence_not_a_traceback(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    def broken(_job: Job, _progress: Progress) -> chain.Workup:
        raise ZeroDivisionError("oh")

    monkeypatch.setattr(chain, "run", broken)
    async with opened(app):
        assert "ZeroDivisionError" in said(app)[-1]
        assert not app.desk.working


async def test_a_refused_span_shows_why_in_its_view(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    def buckled(_job: Job, _progress: Progress) -> tuple[chain.StateModes, ...]:
        raise Refusal("this span buckles", "check the temperature")

    monkeypatch.setattr(chain, "state_modes", buckled)
    async with opened(app) as pilot:
        await pilot.press("3")
        await pilot.pause()
        assert "This span buckles; check the temperature." in text_of(app, "#handbook")
        assert app.query_one("#step-span", Step).state is StepState.REFUSED


async def test_a_refused_match_shows_why_in_its_view(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    refused = (
        chain.StepRefusal("match", "no plausible support explains 23 Hz; check the pipe size"),
    )
    monkeypatch.setattr(
        chain, "run", lambda job, _: glycol.workup(job, match=None, refused=refused)
    )
    async with opened(app) as pilot:
        await pilot.press("4")
        await pilot.pause()
        assert "No plausible support explains 23 Hz" in text_of(app, "#match-text")
        assert app.query_one("#step-match", Step).state is StepState.REFUSED


async def test_a_file_that_is_no_job_is_one_sentence(tmp_path: Path, quick: None) -> None:
    path = tmp_path / "job.toml"
    path.write_text("title = 3 metres", encoding="utf-8")
    app = FieldkitApp(path)
    async with opened(app):
        assert app.desk.job is None
        assert str(path) in said(app)[-1]
        assert "No job is open" in text_of(app, "#reading")


async def test_without_a_job_the_app_offers_a_start(quick: None) -> None:
    app = FieldkitApp()
    async with opened(app) as pilot:
        assert isinstance(app.screen, PickScreen)
        await pilot.press("down", "down", "enter")
        await settled(pilot)
        assert app.desk.job is not None
        assert app.desk.job.title == "New job"
        assert app.here == "span"


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
        await pilot.press("enter")
        await pilot.pause()
        app.screen.query_one(Input).value = str(tmp_path / "samples")
        await pilot.press("enter")
        await pilot.pause()
        await pilot.press("enter")
        await settled(pilot)
        assert asked == [tmp_path / "samples"]
        assert app.desk.job is not None


async def test_open_asks_for_a_path_and_completes_it(app: FieldkitApp, job_path: Path) -> None:
    async with opened(app) as pilot:
        await pilot.press("o")
        await pilot.pause()
        assert isinstance(app.screen, PathScreen)
        typed = app.screen.query_one(Input)
        typed.value = str(job_path)[:-3]
        typed.cursor_position = len(typed.value)
        await until(pilot, lambda: typed._suggestion != "")
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
    path.write_text(
        glycol_text().replace("Glycol booster, discharge line", hostile), encoding="utf-8"
    )
    app = FieldkitApp(path)
    async with opened(app) as pilot:
        await pilot.press("3")
        await pilot.pause()
        assert "[red]\\u001b[31mtitle[/]" in text_of(app, "#job-title")
        assert rows_of(app, "#rows")[0][1].startswith("[red]\\u001b")
        assert "\x1b" not in app.export_screenshot()


def glycol_text() -> str:
    from tests.ui.job_text import JOB_TEXT

    return JOB_TEXT


async def test_the_sheet_is_saved_as_a_text_file(app: FieldkitApp, tmp_path: Path) -> None:
    async with opened(app) as pilot:
        await pilot.press("6")
        await pilot.pause()
        await pilot.press("w")
        await pilot.pause()
        app.screen.query_one(Input).value = str(tmp_path / "advice.txt")
        await pilot.press("enter")
        await settled(pilot)
        assert "Glycol booster" in (tmp_path / "advice.txt").read_text(encoding="utf-8")


async def test_keys_are_listed_and_light_follows_dark(app: FieldkitApp) -> None:
    async with opened(app) as pilot:
        await pilot.press("question_mark")
        await pilot.pause()
        assert isinstance(app.screen, TextScreen)
        for line in ("Write the job file", "Draw the mode before", "Save this text as a file"):
            assert line in app.screen.text
        await pilot.press("escape")
        await pilot.pause()
        await pilot.press("t")
        assert app.theme == "textual-light"


async def test_the_palette_offers_every_command(app: FieldkitApp) -> None:
    async with opened(app):
        names = {command.title for command in app.get_system_commands(app.screen)}
        assert {"Detune", "Save as", "Sample job", "Stop", "Keys"} <= names


async def test_without_recordings_the_span_and_the_cure_still_answer(
    tmp_path: Path, quick: None, monkeypatch: pytest.MonkeyPatch
) -> None:
    text = JobText(glycol_text()).without("recording", 1).without("recording", 0)
    path = tmp_path / "job.toml"
    text.save(path)
    monkeypatch.setattr(chain, "run", lambda job, _: glycol.workup(job, match=None))
    app = FieldkitApp(path)
    async with opened(app) as pilot:
        assert app.query_one("#step-tap", Step).state is StepState.TO_DO
        assert app.query_one("#step-detune", Step).state is StepState.DONE
        assert "Nothing tapped yet" in text_of(app, "#reading")
        await pilot.press("5")
        await settled(pilot)
        assert len(rows_of(app, "#fixes")) == 3
