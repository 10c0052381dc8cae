"""The waterfall on screen: shades where the levels are, a cursor in time, read in a thread."""

from __future__ import annotations

import numpy as np
import pytest
from textual.app import App
from textual.widgets import Static

from fieldkit.detune.excitation import bands
from fieldkit.errors import Refusal
from fieldkit.signal.waterfall import Waterfall
from fieldkit.ui.waterfall_screen import WaterfallDrawing, WaterfallScreen, waterfall_data
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.waterfall_art import SHADES, draw_waterfall, shaded, waterfall_frame
from fieldkit.workup import waterfall as chain
from tests.ui import glycol
from tests.ui.driving import SIZES, opened, settled, until

ORDERS = bands([glycol.PUMP], 0.0)


def made(times=40, columns=100) -> Waterfall:
    """A line that goes from 20 to 60 Hz, a thousand times above everything else."""
    frequency = np.linspace(1.0, 199.0, columns)
    line = np.linspace(20.0, 60.0, times)
    rms = np.full((times, columns), 1e-3)
    rms[np.arange(times), np.abs(frequency - line[:, None]).argmin(axis=1)] = 1.0
    rms[times // 2] *= 2
    return Waterfall(np.arange(times) * 3.0, frequency, rms, line, rms.max(axis=1), 0.2, "m/s^2")


@pytest.mark.parametrize("rows", [6, 17, 60])
def test_the_darkest_shade_follows_the_line(rows):
    data = waterfall_data(made(), ())
    frame = waterfall_frame(data, 80, rows)
    dark = shaded(data, frame, 40.0)
    places = np.array([row.argmax() for row in dark])
    assert (np.diff(places) >= 0).all()
    assert frame.axis.value((places[0] + 0.5) / frame.columns) == pytest.approx(20.0, abs=5)
    assert frame.axis.value((places[-1] + 0.5) / frame.columns) == pytest.approx(
        60.0, abs=5 + 40 / frame.rows
    )
    assert (dark > 0).sum() < 0.15 * dark.size


def test_a_deeper_picture_shows_weaker_levels():
    data = waterfall_data(made(), ())
    frame = waterfall_frame(data, 80, 20)
    assert (shaded(data, frame, 80.0) > 0).all()
    assert not (shaded(data, frame, 20.0) > 0).all()


def test_orders_and_cursor_are_told_by_glyphs():
    canvas = Canvas(80, 20)
    draw_waterfall(canvas, waterfall_data(made(), ORDERS), 40.0, (20, 40.0))
    text = "\n".join(canvas.lines())
    for told in ("┊", "pump", "▶", "X", "Hz", "█"):
        assert told in text
    assert SHADES[0] == " "


@pytest.mark.parametrize(("columns", "rows"), [(30, 3), (5, 1), (0, 0)])
def test_it_is_drawn_at_any_size(columns, rows):
    canvas = Canvas(columns, rows)
    draw_waterfall(canvas, waterfall_data(made(), ORDERS), 40.0, (0, 20.0))
    assert len(canvas.lines()) == rows


class Bare(App[None]):
    def on_mount(self) -> None:
        self.push_screen(WaterfallScreen(glycol.RUN_ENTRY, ORDERS, 200.0))


def words(app: App[None], name: str) -> str:
    return str(app.screen.query_one(name, Static).render())


@pytest.mark.parametrize("size", SIZES)
async def test_the_cursor_starts_where_it_is_strongest_and_moves(size, monkeypatch):
    monkeypatch.setattr(chain, "waterfall_of", lambda *_: made())
    app = Bare()
    async with app.run_test(size=size) as pilot:
        await settled(pilot)
        assert "moves from" in words(app, "#waterfall-reading")
        assert words(app, "#waterfall-at").startswith("1:00.0: strongest 40.51 Hz")
        await pilot.press("down")
        assert words(app, "#waterfall-at").startswith("1:03.0")
        await pilot.press("home", "minus")
        assert "30 dB deep" in words(app, "#waterfall-at")
        await pilot.click(WaterfallDrawing, offset=(20, 1))
        assert words(app, "#waterfall-at").startswith("0.0 s")


async def test_a_recording_that_tells_nothing_says_why(monkeypatch):
    def refuse(*_):
        raise Refusal("0.5 s are too short", "record longer")

    monkeypatch.setattr(chain, "waterfall_of", refuse)
    app = Bare()
    async with app.run_test() as pilot:
        await settled(pilot)
        assert "too short" in app.screen.as_text()[0]


async def test_it_opens_from_the_recording_on_screen(app, monkeypatch):
    monkeypatch.setattr(chain, "waterfall_of", lambda *_: made())
    async with opened(app) as pilot:
        await until(pilot, lambda: app.desk.workup is not None)
        await pilot.press("2")
        await until(pilot, lambda: app.view("running").reading is not None)
        await pilot.press("h")
        await until(pilot, lambda: isinstance(app.screen, WaterfallScreen))
        await until(pilot, lambda: app.screen.found is not None)
        told = app.screen.as_text()
        await pilot.press("Y")
        await until(pilot, lambda: app.clipboard == "\n".join(told))
