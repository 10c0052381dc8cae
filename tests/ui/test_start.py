"""The start screen, the guided path, unsaved work, undo, units, and the user's own editor."""

from __future__ import annotations

import sys
from contextlib import nullcontext
from pathlib import Path

import pytest
from textual.pilot import Pilot
from textual.widgets import Input, OptionList, Static

from fieldkit.errors import InputError
from fieldkit.job import journal, recent
from fieldkit.job.store import load_text, new_job_text
from fieldkit.ui import own_editor
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.broken_screen import BrokenScreen
from fieldkit.ui.dialogs import AskScreen
from fieldkit.ui.forms.offers import Offer, machines, materials, ranked, sizes
from fieldkit.ui.start.guided import GuidedScreen
from fieldkit.ui.start.picker import FilePicker, listing, split_path
from fieldkit.ui.start.start_screen import StartScreen
from fieldkit.ui.start.steps import station_text
from fieldkit.ui.table import Table
from tests.ui.capturing import on_screen
from tests.ui.driving import change_something, opened, said, settled, until
from tests.ui.test_journeys import at_step, fields_of, typed


def offered(screen: StartScreen) -> str:
    """The text of the list on the start screen."""
    options = screen.query_one(OptionList).options
    return "\n".join(str(option.prompt) for option in options)


async def test_going_back_loses_nothing_and_leaving_asks(
    tmp_path: Path, quick: None, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Half a leg waits while the pipe is looked at again; kept for later, the start offers it."""
    monkeypatch.chdir(tmp_path)
    app = FieldkitApp()
    async with app.run_test(size=(80, 24)) as pilot:
        await on_screen(pilot, StartScreen)
        await pilot.press("n")
        await on_screen(pilot, GuidedScreen)
        screen = app.screen
        assert isinstance(screen, GuidedScreen)
        await at_step(pilot, "pipe")
        await typed(pilot, "Line 7", "", "NPS 4", "20")
        await pilot.press("pagedown")
        await pilot.pause()
        said_of = str(screen.pane.query_one(".step-says", Static).render())
        assert "NPS 4 does not exist in schedule '20'" in said_of
        fields_of(pilot).focus_on("schedule")
        await pilot.press("ctrl+u", "4", "0", "pagedown")
        await at_step(pilot, "leg")
        await pilot.press(*"+x", "enter", *"3.1")
        await pilot.press("pageup")
        await at_step(pilot, "pipe")
        assert fields_of(pilot).values["title"] == "Line 7"
        await pilot.press("pagedown")
        await at_step(pilot, "leg")
        assert fields_of(pilot).values["length"] == "3.1"
        await pilot.press("pagedown")
        await at_step(pilot, "support")
        assert screen.draft.of("leg") == ({"direction": "+x", "length": "3.1"},)
        await pilot.press("escape")
        await on_screen(pilot, AskScreen)
        await pilot.press("escape")
        await on_screen(pilot, GuidedScreen)
        await pilot.press("escape")
        await on_screen(pilot, AskScreen)
        await pilot.press("enter")
        await on_screen(pilot, StartScreen)
        assert "Line 7  half described, 1 leg" in offered(app.screen)  # type: ignore[arg-type]
        await pilot.press("r")
        await at_step(pilot, "support")
        await pilot.press("escape")
        await on_screen(pilot, AskScreen)
        await pilot.press("right", "enter")
        await on_screen(pilot, StartScreen)
        assert "Never saved" not in offered(app.screen)  # type: ignore[arg-type]
        assert journal.all_kept() == ()


async def test_a_row_is_changed_and_taken_out_again(
    tmp_path: Path, quick: None, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    app = FieldkitApp()
    async with app.run_test(size=(80, 24)) as pilot:
        await on_screen(pilot, StartScreen)
        await pilot.press("n")
        await at_step_when_there(pilot, "pipe")
        await typed(pilot, "", "", "3", "40")
        await pilot.press("pagedown")
        await at_step(pilot, "leg")
        await typed(pilot, "+x", "20' 3\"", "", "+z", "2 m", "")
        pane = app.screen.pane  # type: ignore[attr-defined]
        assert [row["length"] for row in pane.rows] == ["20' 3\"", "2 m"]
        pane.pick(0)
        await pilot.pause()
        assert "6.172 m" in str(
            fields_of(pilot).row("length").query_one(".field-says", Static).render()
        )
        fields_of(pilot).focus_on("length")
        await pilot.press("ctrl+u", *"5 m", "enter", "enter")
        assert [row["length"] for row in pane.rows] == ["5 m", "2 m"]
        pane.pick(1)
        await pilot.press("ctrl+d")
        assert [row["length"] for row in pane.rows] == ["5 m"]


async def at_step_when_there(pilot: Pilot[None], table: str) -> None:
    await on_screen(pilot, GuidedScreen)
    await at_step(pilot, table)


async def test_recent_jobs_stand_on_the_start_screen_with_their_state(
    tmp_path: Path, job_path: Path, quick: None
) -> None:
    broken, fresh = tmp_path / "broken.toml", tmp_path / "fresh.toml"
    broken.write_text("fieldkit = 1\ntitle = oops\n", encoding="utf-8")
    new_job_text().save(fresh)
    for path, state in ((broken, ""), (fresh, ""), (job_path, "3 taps, matched, best fix 94 %")):
        recent.remember(path, state)
    app = FieldkitApp()
    async with app.run_test(size=(80, 24)) as pilot:
        await on_screen(pilot, StartScreen)
        await settled(pilot)
        shown = offered(app.screen)  # type: ignore[arg-type]
        assert "Glycol booster, discharge line" in shown
        assert "3 taps, matched, best fix 94 %" in shown
        assert "no recordings yet" in shown
        assert "cannot be read: " in shown
        await pilot.press("1")
        await until(pilot, lambda: app.desk.job is not None)
        await settled(pilot)
    assert "best fix 97 %" in recent.recents()[0].state


async def test_changes_left_unsaved_are_offered_and_can_be_thrown_away(
    app: FieldkitApp, job_path: Path
) -> None:
    text = load_text(job_path)
    changed = text.with_value("title", "Changed").text
    key = journal.key_of(job_path)
    journal.keep(journal.Kept(key, str(job_path), text=changed, base=journal.digest("other")))
    async with app.run_test(size=(80, 24)) as pilot:
        await on_screen(pilot, AskScreen)
        assert "never saved" in app.screen.question  # type: ignore[attr-defined]
        assert "changed by something else" in app.screen.question  # type: ignore[attr-defined]
        await pilot.press("right", "enter")
        await until(pilot, lambda: app.desk.job is not None)
        assert app.desk.job is not None
        assert app.desk.job.title == "Glycol booster, discharge line"
        assert journal.all_kept() == ()


async def test_a_change_is_kept_until_it_is_saved(app: FieldkitApp, job_path: Path) -> None:
    async with opened(app) as pilot:
        assert journal.all_kept() == ()
        await change_something(pilot)
        (kept,) = journal.all_kept()
        assert "Another title" in kept.text
        await pilot.press("ctrl+s")
        await settled(pilot)
        assert journal.all_kept() == ()


async def test_undo_and_redo_go_over_the_whole_job_and_say_what(app: FieldkitApp) -> None:
    async with opened(app) as pilot:
        await change_something(pilot)
        await pilot.press("y")
        await settled(pilot)
        assert app.desk.units == "US"
        assert app.desk.workup is not None
        assert app.desk.workup.job.units == "US"
        await pilot.press("ctrl+z")
        await settled(pilot)
        assert said(app)[-1] == "Taken back: units: left out → US"
        await pilot.press("u")
        await settled(pilot)
        assert said(app)[-1].startswith("Taken back: title: Glycol booster, discharge l")
        assert app.desk.job is not None
        assert app.desk.job.title == "Glycol booster, discharge line"
        await pilot.press("U", "ctrl+y")
        await settled(pilot)
        assert said(app)[-1] == "Again: units: left out → US"
        assert app.desk.units == "US"
        await pilot.press("U")
        await pilot.pause()
        assert "nothing to make again" in said(app)[-1]


def script(folder: Path, body: str) -> str:
    """An editor that does what ``body`` says with ``path``; as EDITOR names it."""
    file = folder / "editor.py"
    file.write_text(
        f"import sys, pathlib\npath = pathlib.Path(sys.argv[-1])\nseen = path.read_text()\n{body}",
        encoding="utf-8",
    )
    return f"{sys.executable} {file}"


async def test_the_users_editor_edits_the_job_and_faults_stand_at_their_line(
    app: FieldkitApp, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The first time it leaves a fault, the second time it mends it."""
    body = (
        "bad = 'NPS 3.7' in seen\n"
        "path.write_text(seen.replace('NPS 3.7', 'NPS 4') if bad "
        "else seen.replace('NPS 3', 'NPS 3.7'))\n"
    )
    monkeypatch.delenv("VISUAL", raising=False)
    monkeypatch.setenv("EDITOR", script(tmp_path, body))
    monkeypatch.setattr(FieldkitApp, "suspend", lambda _self: nullcontext())
    async with opened(app) as pilot:
        await pilot.press("E")
        await on_screen(pilot, BrokenScreen)
        marked = str(app.screen.query_one("#excerpt", Static).render())
        assert '▶    5  size = "NPS 3.7"' in marked
        await pilot.press("e")
        await until(pilot, lambda: len(app.screen_stack) == 1)
        await settled(pilot)
        assert app.desk.job is not None
        assert app.desk.job.span.pipe.label.startswith("NPS 4")
        assert app.open_job is not None
        assert app.open_job.unsaved
        await pilot.press("u")
        await settled(pilot)
        assert app.desk.job.span.pipe.label.startswith("NPS 3")


async def test_an_editor_that_is_not_there_is_one_sentence(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("VISUAL", "no-such-editor --wait")
    async with opened(app) as pilot:
        await pilot.press("E")
        await until(pilot, lambda: bool(said(app)))
        assert "the editor that VISUAL names is not here: 'no-such-editor --wait'" in said(app)[-1]


def test_visual_comes_before_editor_and_both_may_have_arguments() -> None:
    both = {"VISUAL": f"{sys.executable} -x", "EDITOR": "nothing-like-it"}
    assert own_editor.editor_command(both) == [sys.executable, "-x"]
    with pytest.raises(InputError, match="EDITOR"):
        own_editor.editor_command({"EDITOR": "nothing-like-it"})


def test_without_any_editor_one_is_asked_for(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("shutil.which", lambda _name: None)
    with pytest.raises(InputError, match="no text editor"):
        own_editor.editor_command({})


def test_an_editor_that_ends_in_failure_changes_nothing(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.delenv("VISUAL", raising=False)
    monkeypatch.setenv("EDITOR", script(tmp_path, "sys.exit(3)\n"))
    with pytest.raises(InputError, match="status 3"):
        own_editor.edited("a", "job.toml")


async def test_the_picker_walks_into_folders_and_says_what_each_file_is(
    tmp_path: Path, app: FieldkitApp, job_path: Path
) -> None:
    (tmp_path / "deep").mkdir()
    new_job_text().save(tmp_path / "deep" / "other.toml")
    (tmp_path / "deep" / "notes.toml").write_text("a = 1\n", encoding="utf-8")
    async with opened(app) as pilot:
        await pilot.press("o")
        await on_screen(pilot, FilePicker)
        await pilot.press(*"deep", "enter")
        table = app.screen.query_one(Table)
        await until(pilot, lambda: "other.toml" in str(table.chosen) or table.row_count > 2)
        await settled(pilot)
        shown = [[cell.plain for cell in table.get_row_at(i)] for i in range(table.row_count)]
        assert shown[0][:2] == ["notes.toml", "no job file"]
        assert shown[1][:2] == ["other.toml", "New job: no recordings yet"]
        app.screen.query_one(Input).value = str(tmp_path / "nowhere" / "x")
        await pilot.pause()
        says = str(app.screen.query_one("#picker-says", Static).render())
        assert "there is no folder" in says


def test_a_path_is_split_into_the_folder_to_list_and_what_its_names_hold(tmp_path: Path) -> None:
    assert split_path("tap", tmp_path) == (tmp_path, "tap")
    assert split_path("sub/ta", tmp_path) == (tmp_path / "sub", "ta")
    assert split_path("/etc/ho", tmp_path) == (Path("/etc"), "ho")
    assert listing(tmp_path / "missing", (".toml",)) == []


@pytest.mark.parametrize(
    ("offers", "text", "first"),
    [
        (sizes({}), "4", "NPS 4"),
        (sizes({}), "DN 100", "NPS 4"),
        (sizes({}), "100", "NPS 4"),
        (sizes({}), "2-1", "NPS 2-1/2"),
        (materials({}), "steel", "carbon steel"),
        (materials({}), "316", "stainless steel 316"),
        (machines({}), "pump", "centrifugal pump"),
        (machines({}), "rec", "reciprocating compressor"),
        ([Offer("0 m", "start"), Offer("3 m", "end")], "en", "3 m"),
    ],
)
def test_the_likeliest_choice_comes_first(offers: list[Offer], text: str, first: str) -> None:
    assert ranked(offers, text)[0].value == first


def test_nothing_is_offered_for_what_fits_nothing() -> None:
    assert ranked(sizes({}), "88.9 mm") == []


@pytest.mark.parametrize("units", ["SI", "US"])
@pytest.mark.parametrize("at_m", [0.0, 3.4036, 8.1722, 1 / 3, 12.3456789])
def test_a_station_that_is_offered_never_lies_beyond_the_end(at_m: float, units: str) -> None:
    from fieldkit.quantity import parse

    assert -1e-5 <= parse(station_text(at_m, units), "length") - at_m <= 1e-7
