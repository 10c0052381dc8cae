"""The chance map on screen: read without colour, moved by keys, and a change handed over."""

from __future__ import annotations

from functools import cache

import pytest
from textual.app import App
from textual.widgets import Static

from fieldkit.detune.candidates import Search
from fieldkit.detune.fixes import AddMass, AddSupport
from fieldkit.detune.verdict import Verdict
from fieldkit.job.document import Job
from fieldkit.job.store import JobText
from fieldkit.ui.chance_screen import ChanceScreen, MapDrawing
from fieldkit.workup import chance
from tests.ui.driving import SIZES, settled
from tests.ui.job_text import JOB_TEXT


@cache
def made() -> tuple[Job, Search]:
    job = JobText(JOB_TEXT).job()
    return job, chance.search_of(job, None)


class Bare(App[None]):
    """Nothing but the map."""

    def __init__(self) -> None:
        super().__init__()
        self.handed: list[Verdict | None] = []

    def on_mount(self) -> None:
        self.push_screen(ChanceScreen(made()[0], None), self.handed.append)


@pytest.fixture
def app(monkeypatch: pytest.MonkeyPatch) -> Bare:
    """The map of the made-up job; the search is made once for all tests."""
    search = made()[1]
    monkeypatch.setattr(chance, "search_of", lambda *_: search)
    return Bare()


def words(app: Bare, name: str) -> str:
    return str(app.screen.query_one(name, Static).render())


def drawn(app: Bare) -> str:
    return app.screen.query_one(MapDrawing).render().plain


@pytest.mark.parametrize("size", SIZES)
async def test_the_map_fits_and_is_read_without_colour(app: Bare, size: tuple[int, int]) -> None:
    async with app.run_test(size=size) as pilot:
        await settled(pilot)
        text = drawn(app)
        assert text.count("X") == 1
        assert "MN/m ┤" in text
        assert all(len(line) <= size[0] for line in text.splitlines())
        assert "new support" in words(app, "#map-title")
        assert "modes then" in words(app, "#map-modes")


async def test_arrows_move_the_cursor_and_the_reading(app: Bare) -> None:
    async with app.run_test(size=(80, 24)) as pilot:
        await settled(pilot)
        screen = app.screen
        assert isinstance(screen, ChanceScreen)
        before, reading = screen.at, words(app, "#map-words")
        await pilot.press("right", "right", "up")
        await settled(pilot)
        assert screen.at == (before[0] + 2, before[1] + 1)
        assert words(app, "#map-words") != reading
        await pilot.press("home")
        await settled(pilot)
        assert screen.at == before


async def test_directions_and_masses_have_maps_of_their_own(app: Bare) -> None:
    async with app.run_test(size=(80, 24)) as pilot:
        await settled(pilot)
        await pilot.press("d")
        await settled(pilot)
        assert words(app, "#map-title").endswith("support, vertical")
        await pilot.press("k")
        await settled(pilot)
        assert "mass" in words(app, "#map-title")
        assert "kg" in drawn(app)


@pytest.mark.parametrize(("key", "kind"), [("", AddSupport), ("k", AddMass)])
async def test_enter_hands_over_the_change_re_solved(app: Bare, key: str, kind: type) -> None:
    async with app.run_test(size=(80, 24)) as pilot:
        await settled(pilot)
        if key:
            await pilot.press(key)
            await settled(pilot)
        assert isinstance(app.screen, ChanceScreen)
        found, at = app.screen.found, app.screen.at
        await pilot.press("enter")
        await settled(pilot)
        (verdict,) = app.handed
        assert found is not None
        assert verdict is not None
        assert isinstance(verdict.change, kind)
        assert verdict.change == found.change(*at)
        assert verdict.chance == pytest.approx(float(found.chance[at]), abs=0.05)


async def test_escape_hands_over_nothing(app: Bare) -> None:
    async with app.run_test(size=(80, 24)) as pilot:
        await settled(pilot)
        await pilot.press("escape")
        await settled(pilot)
        assert app.handed == [None]
