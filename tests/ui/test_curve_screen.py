"""The curves of a change on screen: read without colour, moved by keys, a value handed over."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest
from textual.app import App
from textual.widgets import Static

from fieldkit.detune import curves as numeric
from fieldkit.detune.fixes import AddSupport, MoveSupport
from fieldkit.detune.rank import judged_change
from fieldkit.detune.verdict import Verdict
from fieldkit.job.document import Job
from fieldkit.job.store import JobText
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.curve_screen import CurveScreen
from fieldkit.ui.widgets import BandShade
from fieldkit.ui.widgets.curve_art import CurveData, curve_frame, draw_curves, rows_between
from fieldkit.ui.widgets.curve_plot import CurvePlot
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.view_range import Axis
from fieldkit.workup import curves as chain
from tests.ui.driving import SIZES, opened, settled, until
from tests.ui.job_text import JOB_TEXT

CHANGE = AddSupport(1.6, 4e6, 4e6)
STEPS = 9
SEARCH = chain.curve_search


@cache
def made(change=CHANGE) -> tuple[Job, object, Verdict]:
    job = JobText(JOB_TEXT).job()
    search = SEARCH(job, None)
    return job, search, judged_change(search, job.tapped, job.running, change)


@cache
def judged(change, kind):
    job, search, _ = made()
    return numeric.fix_curve(search, job.running, change, kind, steps=STEPS)


class Bare(App[None]):
    """Nothing but the curves."""

    def __init__(self, change=CHANGE) -> None:
        super().__init__()
        self.change = change
        self.handed: list[Verdict | None] = []

    def on_mount(self) -> None:
        job, _, fix = made(self.change)
        self.push_screen(CurveScreen(job, None, fix), self.handed.append)


@pytest.fixture(autouse=True)
def _few_steps(monkeypatch: pytest.MonkeyPatch) -> None:
    """Nine values, judged once for all tests."""
    monkeypatch.setattr(chain, "curve_search", lambda *_: made()[1])
    monkeypatch.setattr(
        chain,
        "curve_of",
        lambda _job, search, change, kind, _progress: (
            judged(change, kind)
            if numeric.curves_of(search, change).count(kind)
            else numeric.varied(search, change, kind)
        ),
    )


def words(app: App[None], name: str) -> str:
    return str(app.screen.query_one(name, Static).render())


DATA = CurveData(
    np.linspace(0.0, 4.0, 5),
    False,
    np.stack([np.outer(np.linspace(20, 40, 5), [0.9, 1, 1.1]), np.full((5, 3), 70.0)], axis=1),
    " ·▒██",
    (BandShade(48.0, 50.0, 40.0, 60.0, "pump 2x"),),
    2,
    100.0,
    ((0.0, "0 m"), (4.0, "4 m")),
)


def test_the_picture_tells_everything_without_colour():
    """Band by hatch and name, marker and drawn value by glyph, modes by number, chance by shade."""
    canvas = Canvas(80, 20)
    draw_curves(canvas, DATA, 3)
    text = "\n".join(canvas.lines())
    for told in ("╱", "▒", "pump 2x", "│", "┊", "▲", "△", "chance", "█", "Hz", "0 m", "4 m"):
        assert told in text
    assert canvas.lines()[0].count("█") > 0
    ends = [line.rstrip()[-1] for line in canvas.lines() if line.rstrip()[-1:] in ("1", "2")]
    assert ends == ["2", "1"]


@pytest.mark.parametrize(("columns", "rows"), [(80, 20), (40, 8), (20, 4), (3, 1), (0, 0)])
def test_it_is_drawn_at_any_size(columns, rows):
    canvas = Canvas(columns, rows)
    draw_curves(canvas, DATA, 0)
    assert len(canvas.lines()) == rows


def test_rows_of_a_band_lie_where_its_frequencies_do():
    frame = curve_frame(DATA, 80, 23)
    hertz = Axis(0.0, 100.0)
    whole = rows_between(frame, hertz, 0.0, 100.0)
    assert (whole.start, whole.stop) == (frame.top, frame.bottom)
    upper = rows_between(frame, hertz, 50.0, 100.0)
    assert upper.start == frame.top
    assert abs(upper.stop - (frame.top + frame.rows / 2)) <= 1
    assert rows_between(frame, hertz, 120.0, 130.0) == slice(frame.top, frame.top)


@pytest.mark.parametrize("size", SIZES)
async def test_the_screen_says_what_the_drawn_value_promises(size):
    app = Bare()
    async with app.run_test(size=size) as pilot:
        await settled(pilot)
        assert "place of the new support" in words(app, "#curve-title")
        assert words(app, "#curve-words").startswith("1.60 m:")
        assert "as drawn" in words(app, "#curve-words")
        assert "lat" in words(app, "#curve-modes")
        assert "90 %" in words(app, "#curve-kept")


async def test_arrows_move_the_marker_and_home_brings_it_back():
    app = Bare()
    async with app.run_test() as pilot:
        await settled(pilot)
        before = words(app, "#curve-words")
        await pilot.press("right")
        assert words(app, "#curve-words") != before
        await pilot.press("shift+right", "shift+right")
        assert app.screen.at == STEPS - 1
        await pilot.press("home")
        assert words(app, "#curve-words") == before


async def test_a_click_puts_the_marker_on_the_nearest_value():
    app = Bare()
    async with app.run_test() as pilot:
        await settled(pilot)
        plot = app.screen.query_one(CurvePlot)
        frame = curve_frame(plot.data, plot.size.width, plot.size.height)
        await pilot.click(CurvePlot, offset=(frame.right - 1, 5))
        assert app.screen.at == STEPS - 1


async def test_another_size_is_asked_for_by_its_key():
    app = Bare()
    async with app.run_test() as pilot:
        await settled(pilot)
        await pilot.press("k")
        await settled(pilot)
        assert "stiffness of the new support" in words(app, "#curve-title")
        assert words(app, "#curve-words").startswith("4.0 MN/m:")
        await pilot.press("p")
        assert "place" in words(app, "#curve-title")


async def test_a_size_that_makes_no_sense_is_told_in_a_sentence():
    app = Bare(MoveSupport(1, 3.0))
    async with app.run_test() as pilot:
        await settled(pilot)
        await pilot.press("k")
        await settled(pilot)
        assert "sets no stiffness" in words(app, "#curve-words")
        assert "place" in words(app, "#curve-title")


async def test_enter_hands_over_the_change_with_the_value_under_the_marker():
    app = Bare()
    async with app.run_test() as pilot:
        await settled(pilot)
        await pilot.press("right", "enter")
        await settled(pilot)
        value = judged(CHANGE, "place").varied.value
        drawn = judged(CHANGE, "place").varied.drawn
        assert app.handed[0].change == AddSupport(float(value[drawn + 1]), 4e6, 4e6)


async def test_escape_changes_nothing():
    app = Bare()
    async with app.run_test() as pilot:
        await settled(pilot)
        await pilot.press("escape")
        assert app.handed == [None]


async def test_the_curves_open_from_the_chosen_change(app: FieldkitApp):
    async with opened(app) as pilot:
        await pilot.press("5")
        await until(pilot, lambda: app.view("detune").chosen is not None)
        await pilot.press("c")
        await pilot.pause()
        assert isinstance(app.screen, CurveScreen)
        assert app.screen.fix == app.view("detune").chosen
