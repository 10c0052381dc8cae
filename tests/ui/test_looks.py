"""Looks change at a key, no colour leaves none, and every view can be had as text."""

from __future__ import annotations

import pytest
from rich.segment import Segment
from rich.style import Style
from textual.color import Color
from textual.widgets import Static

from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.as_text import aligned
from fieldkit.ui.desk import STEPS
from fieldkit.ui.looks import CONTRAST, LOOKS, PLAIN, ColourOff
from tests.ui.driving import until
from tests.ui.test_snapshots import StillApp

BLACK = Color.parse("black")


def coloured(app: FieldkitApp) -> set[str]:
    """Colours of everything on the screen but the terminal's own."""
    strips = app.screen._compositor.render_strips()
    found = set()
    for strip in strips:
        for segment in strip.apply_filter(ColourOff(), BLACK) if PLAIN.name == app.theme else strip:
            style = segment.style
            for colour in (style.color, style.bgcolor) if style else ():
                if colour is not None and not colour.is_default:
                    found.add(colour.name)
    return found


def test_no_colour_keeps_text_and_reverses_what_stood_out():
    cursor, plain = Style(color="white", bgcolor="#0178d4"), Style(color="red", bgcolor="#101010")
    first, second = ColourOff().apply([Segment("here", cursor), Segment("not", plain)], BLACK)
    assert (first.text, second.text) == ("here", "not")
    assert first.style.reverse
    assert not second.style.reverse
    assert all(s.style.color.is_default and s.style.bgcolor.is_default for s in (first, second))


async def test_a_key_goes_through_every_look_and_back():
    app = StillApp()
    async with app.run_test() as pilot:
        seen = []
        for _ in LOOKS:
            await pilot.press("t")
            seen.append(app.theme)
        assert seen == ["textual-light", CONTRAST.name, PLAIN.name, "textual-dark"]
        assert not any(isinstance(one, ColourOff) for one in app._filters)


async def test_a_user_who_wants_no_colour_gets_none(monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setenv("NO_COLOR", "1")
    app = StillApp()
    async with app.run_test() as pilot:
        await pilot.pause()
        assert app.theme == PLAIN.name
        assert any(isinstance(one, ColourOff) for one in app._filters)
        assert coloured(app) == set()


@pytest.mark.parametrize(("view", "told"), [
    ("tap", ("23.41", "usable", "struck twice", "decay of 23.4 Hz")),
    ("running", ("pump 2x", "49.1", "RMS")),
    ("span", ("20.9 Hz", "check valve", "elevation", "tap here")),
    ("match", ("support 2 vertical", "by tap", "23.1")),
    ("detune", ("97 %", "Add a clamp", "66.4", "worst speed")),
    ("sheet", ("",)),
])  # fmt: skip
async def test_every_view_is_there_as_text(view: str, told: tuple[str, ...]):
    app = StillApp()
    async with app.run_test(size=(80, 24)) as pilot:
        await until(pilot, lambda: app.desk.job is not None)
        await pilot.press(str(STEPS.index(view) + 1))
        await pilot.pause()
        await pilot.press("Y")
        await until(pilot, lambda: len(app.screen_stack) == 2)
        text = app.clipboard
        assert "measured" in text
        for words in told:
            assert words in text
        assert any("as text" in str(s.render()) for s in app.screen.query(Static))


def test_cells_stand_in_even_columns():
    assert aligned([("a", "b"), ("µµµ", "c")]) == "a    b\nµµµ  c"
