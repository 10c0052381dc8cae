"""The span picture: views to turn, marks along it, a shape that swings and can be stopped."""

import numpy as np
import pytest
from textual.app import App

from fieldkit.span.motion import TapPlace
from fieldkit.ui.motion import SETTING, motion_wanted
from fieldkit.ui.span_marks import (
    measuring_items,
    mode_items,
    modes_of_interest,
    tap_words,
)
from fieldkit.ui.widgets import SpanDrawing
from fieldkit.ui.widgets.projection import PLANES, turned
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.span_art import Picture, draw_span
from tests.ui import glycol
from tests.ui.driving import opened

MODE = glycol.states()[1].modes[0]


def metres(value_m):
    return f"{value_m:.1f} m"


@pytest.mark.parametrize(("turn", "tilt", "same"), [(0, 0, 0), (90, 0, 1), (0, 90, 2)])
def test_a_turned_view_agrees_with_the_planes_it_passes(turn, tilt, same):
    points = np.eye(3)
    assert turned(turn, tilt).project(points) == pytest.approx(
        PLANES[same].project(points), abs=1e-9
    )


@pytest.mark.parametrize("turn", [-170, -45, 10, 135])
@pytest.mark.parametrize("tilt", [-30, 0, 35, 90])
def test_a_turned_view_keeps_lengths_across_the_line_of_sight(turn, tilt):
    """The two screen directions are unit vectors at right angles: nothing is stretched."""
    plane = turned(turn, tilt)
    both = np.array([plane.across, plane.up])
    assert both @ both.T == pytest.approx(np.eye(2), abs=1e-9)


def test_the_axes_of_a_turned_view_are_told():
    assert turned(0, 0).key == "z↑ x→ y·"
    assert turned(90, 0).key == "z↑ x· y→"


def test_labels_stand_still_while_the_shape_swings():
    """Text that jumps with every frame cannot be read."""
    also = mode_items(MODE, glycol.SPAN, metres)

    def words(swing):
        canvas = Canvas(70, 16)
        draw_span(
            canvas,
            Picture(glycol.SPAN, MODE, metres, lambda kg: f"{kg:g} kg", also=also, swing=swing),
        )
        return ["".join(c if ord(c) < 0x2800 else " " for c in row) for row in canvas.lines()]

    assert words(-1.0) == words(0.0) == words(0.4) == words(1.0)


def test_the_shape_swings_to_both_sides():
    def dots(swing):
        canvas = Canvas(70, 16)
        draw_span(canvas, Picture(glycol.SPAN, MODE, metres, metres, PLANES[0], swing=swing))
        return canvas.dots

    assert (dots(1.0) != dots(-1.0)).any()
    assert (dots(0.0) != dots(1.0)).any()


def test_a_place_to_tap_is_told_with_its_reason():
    assert tap_words(TapPlace(2.0, 0.5, 3, 4), metres) == (
        "Tap at 2.0 m, sensor beside it: the 4 lowest modes move there, mode 3 least (50 %)."
    )
    assert "tap a second place" in tap_words(TapPlace(2.0, 0.1, 3, 4), metres)


def test_sensors_of_one_place_are_one_mark():
    job = glycol.job(recordings=(glycol.TAP_ENTRY, glycol.TAP_ENTRY))
    glyphs = [item.glyph for item in measuring_items(job, TapPlace(2.0, 0.5, 1, 1), metres)]
    assert glyphs == ["▽", "□"]


def test_modes_above_every_band_are_of_no_interest():
    modes = glycol.states()[0].modes * 4
    assert len(modes_of_interest(modes, ())) == 3
    assert len(modes_of_interest(modes, glycol.DETUNING.bands)) == 6


@pytest.mark.parametrize(
    ("surroundings", "moves"),
    [
        ({}, True),
        ({"NO_COLOR": "1"}, False),
        ({"SSH_CONNECTION": "somewhere"}, False),
        ({"TEXTUAL_ANIMATIONS": "none"}, False),
        ({"TERM": "linux"}, False),
        ({SETTING: "off"}, False),
        ({SETTING: "on", "SSH_TTY": "/dev/pts/1"}, True),
    ],
)
def test_nothing_moves_unasked_where_stillness_is_wanted(surroundings, moves):
    assert motion_wanted(surroundings) is moves


class Shown(App):
    def compose(self):
        yield SpanDrawing()

    def on_mount(self):
        self.query_one(SpanDrawing).show(glycol.SPAN, MODE)


async def test_space_lets_the_shape_swing_and_holds_it():
    async with Shown().run_test() as pilot:
        drawing = pilot.app.query_one(SpanDrawing)
        drawing.focus()
        await pilot.press("space")
        assert drawing.moving
        before = drawing._frame
        drawing._tick()
        assert drawing._frame != before
        await pilot.press("space")
        assert not drawing.moving
        drawing._tick()
        assert drawing._frame == 0


async def test_no_frame_is_drawn_while_the_picture_is_hidden():
    async with Shown().run_test() as pilot:
        drawing = pilot.app.query_one(SpanDrawing)
        drawing.action_move()
        drawing.display = False
        await pilot.pause()
        before = drawing._frame
        drawing._tick()
        assert drawing._frame == before
        assert drawing._clock is not None
        assert not drawing._clock._active.is_set()


async def test_the_view_turns_by_keys(app):
    async with opened(app) as pilot:
        await pilot.press("3")
        drawing = app.view("span").query_one(SpanDrawing)
        await pilot.press("shift+right")
        turn, tilt = drawing.free
        await pilot.press("shift+right", "shift+up")
        assert drawing.free == (turn + 15, tilt + 15)
        await pilot.press("v")
        assert drawing.free is None
