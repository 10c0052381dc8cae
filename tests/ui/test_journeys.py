"""Whole ways through the app: from an empty folder to a saved job and a ranked change."""

from __future__ import annotations

from pathlib import Path

import pytest
from textual.pilot import Pilot
from textual.widgets import OptionList

from fieldkit.job.schema import load_job
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.forms import FormWindow
from fieldkit.ui.forms.fields import Choices, Fields
from fieldkit.ui.start.guided import GuidedScreen
from fieldkit.ui.start.picker import FilePicker
from fieldkit.ui.start.start_screen import StartScreen
from fieldkit.ui.table import Table
from tests.samples import SAMPLES
from tests.ui.capturing import on_screen
from tests.ui.driving import rows_of, settled, until


async def typed(pilot: Pilot[None], *texts: str) -> None:
    """Each text as keys, with enter behind it."""
    for text in texts:
        await pilot.press(*text, "enter")


async def at_step(pilot: Pilot[None], table: str) -> None:
    """The guided path shows a step, and the keyboard is in it."""
    screen = pilot.app.screen
    assert isinstance(screen, GuidedScreen)
    await until(pilot, lambda: screen.steps[screen.draft.step].table == table)
    await until(pilot, lambda: screen.pane is not None and screen.pane.fields.here is not None)


def simulated_tap(folder: Path) -> None:
    """A tap of the booster line: the samples' own simulation, vertical."""
    import frame
    from make import damping_of, modes_in
    from plants import GLYCOL_BOOSTER
    from sound import tap_signal, write_flac

    assert frame.__file__.startswith(str(SAMPLES))
    modes = modes_in(GLYCOL_BOOSTER, GLYCOL_BOOSTER.tapped)
    damping = damping_of(GLYCOL_BOOSTER, GLYCOL_BOOSTER.tapped, len(modes.frequency_hz))
    session = GLYCOL_BOOSTER.taps[0]
    signal = tap_signal(modes, damping, session)
    write_flac(folder / "tap.flac", signal, session.rate_hz, session.bits, session.full_scale)


async def described(pilot: Pilot[None]) -> None:
    """The booster line through all six steps, by keys."""
    await at_step(pilot, "pipe")
    await typed(pilot, "Booster line", "", "4", "40", "", "1045 kg/m^3", "dr", "62 degC")
    await at_step(pilot, "leg")
    await typed(pilot, "+x", "11' 2\"", "", "")
    await at_step(pilot, "support")
    await typed(pilot, "st", "anch", "", "", "1.70 m", "cl", "un", "un")
    await typed(pilot, "end", "gui", "40 MN/m", "40 MN/m", "")
    await at_step(pilot, "mass")
    await typed(pilot, "check valve", "600 mm", "66 lb", "", "")
    await at_step(pilot, "excitation")
    await typed(pilot, "cent", "1450 to 1495 rpm", "7", "", "booster pump", "")
    await at_step(pilot, "goal")
    await typed(pilot, "", "", "120 Hz", "", "")


async def test_from_an_empty_folder_to_a_saved_job_and_a_ranked_change_by_keys(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Nothing is there at the start; the recording is made by the samples' simulation."""
    folder = tmp_path / "site"
    folder.mkdir()
    monkeypatch.chdir(folder)
    app = FieldkitApp()
    async with app.run_test(size=(80, 24)) as pilot:
        await on_screen(pilot, StartScreen)
        await pilot.press("n")
        await on_screen(pilot, GuidedScreen)
        await described(pilot)
        await until(pilot, lambda: app.desk.job is not None)
        simulated_tap(folder)
        await pilot.press("1", "a")
        await on_screen(pilot, FilePicker)
        await until(pilot, lambda: app.screen.query_one(Table).row_count > 1)
        await pilot.press("t", "a", "p", "enter")
        await on_screen(pilot, FormWindow)
        fields = app.screen.query_one(Fields)
        assert fields.values["file"] == "tap.flac"
        for key, text in (("kind", "tap"), ("direction", "vert"), ("at", "1.95 m")):
            fields.focus_on(key)
            await pilot.press("end", "ctrl+u", *text, "tab")
        await pilot.press("enter")
        await until(pilot, lambda: len(app.screen_stack) == 1)
        await pilot.press("ctrl+s")
        await settled(pilot)
        await until(pilot, lambda: not app.desk.working)
        await pilot.press("5")
        await pilot.pause()
        assert app.desk.workup is not None
        assert app.desk.workup.detuning is not None
        assert float(rows_of(app, "#fixes")[0][1].strip("> %")) >= 90
    job = load_job(folder / "booster-line.toml")
    assert job.span.length_m == pytest.approx(3.4036)
    assert [entry.path.name for entry in job.recordings] == ["tap.flac"]
    assert job.excitations[0].orders == (1, 2, 7)
    assert app.open_job is not None
    assert not app.open_job.unsaved


def fields_of(pilot: Pilot[None]) -> Fields:
    """The fields of the step in hand."""
    screen = pilot.app.screen
    assert isinstance(screen, GuidedScreen)
    assert screen.pane is not None
    return screen.pane.fields


async def click_offer(pilot: Pilot[None], key: str, value: str) -> None:
    """Click into a field, then on what it offers."""
    fields = fields_of(pilot)
    await pilot.click(fields.row(key).input)
    await pilot.pause()
    values = [offer.value for offer in fields._offers]
    await pilot.click(fields.query_one(Choices), offset=(2, values.index(value)))
    await pilot.pause()
    assert fields.values[key] == value


async def test_the_way_to_a_described_pipe_by_mouse(
    tmp_path: Path, quick: None, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Only lengths are typed; everything else is clicked."""
    monkeypatch.chdir(tmp_path)
    app = FieldkitApp()
    async with app.run_test(size=(80, 24)) as pilot:
        await on_screen(pilot, StartScreen)
        await pilot.click(OptionList, offset=(6, 0))
        await on_screen(pilot, GuidedScreen)
        await at_step(pilot, "pipe")
        await click_offer(pilot, "units", "US")
        await click_offer(pilot, "size", "NPS 3/8")
        await click_offer(pilot, "schedule", "40")
        await pilot.click("#guide-next")
        await at_step(pilot, "leg")
        await click_offer(pilot, "direction", "+x")
        await pilot.press(*"20 ft")
        await pilot.click("#guide-next")
        await at_step(pilot, "support")
        fields = fields_of(pilot)
        await pilot.click(fields.row("at").input)
        await pilot.pause()
        await pilot.click(fields.query_one(Choices), offset=(2, 0))
        await click_offer(pilot, "kind", "anchor")
        for step in ("mass", "excitation", "goal"):
            await pilot.click("#guide-next")
            await at_step(pilot, step)
        await pilot.click("#guide-next")
        await until(pilot, lambda: app.desk.job is not None)
        assert app.desk.units == "US"
        await settled(pilot)
        await pilot.click("#step-detune")
        await pilot.pause()
        assert app.here == "detune"
    assert load_job(tmp_path / "new-job.toml").span.supports[0].kind == "anchor"
