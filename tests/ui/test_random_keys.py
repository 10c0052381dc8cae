"""The app under a few dozen random keys, always the same ones, on the made-up job.

For minutes, and with real work behind the screens: ``python -m tests.abuse.random_keys``.
"""

from __future__ import annotations

import random

import pytest

from fieldkit.ui.palette import Palette
from tests.abuse.random_keys import Played, played
from tests.ui.job_text import JOB_TEXT


@pytest.mark.parametrize("seed", [1])
async def test_app_survives_random_keys_and_saves(seed, tmp_path, quick):
    """No exception, in the app or in its threads, and the job can still be saved."""
    rng = random.Random(seed)
    told = await played(tmp_path, rng, lambda so_far: so_far.keys < 40, JOB_TEXT)
    assert not told.wrong
    assert told.saved


async def test_palette_stands_in_a_terminal_of_one_character(app):
    """Its list has no line there, and a page of it cannot be turned."""
    async with app.run_test(size=(1, 1)) as pilot:
        app.action_command_palette()
        await pilot.pause(0.3)
        assert Palette.is_open(app)
        await pilot.press("pagedown", "down", "end", "pageup")
        assert app.is_running


def test_line_tells_what_went_wrong():
    """Counts, and whether the app still saves."""
    assert "1 exceptions, it no longer saves" in Played(3, 1, 0, ["KeyError: 1"]).line()
