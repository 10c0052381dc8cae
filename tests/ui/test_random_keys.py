"""The app under a few dozen random keys, always the same ones, on the made-up job.

For minutes, and with real work behind the screens: ``python -m tests.abuse.random_keys``.
"""

from __future__ import annotations

import random

import pytest

from tests.abuse.random_keys import Played, played
from tests.ui.job_text import JOB_TEXT


@pytest.mark.parametrize("seed", [1])
async def test_app_survives_random_keys_and_saves(seed, tmp_path, quick):
    """No exception, in the app or in its threads, and the job can still be saved."""
    rng = random.Random(seed)
    told = await played(tmp_path, rng, lambda so_far: so_far.keys < 40, JOB_TEXT)
    assert not told.wrong
    assert told.saved


def test_line_tells_what_went_wrong():
    """Counts, and whether the app still saves."""
    assert "1 exceptions, it no longer saves" in Played(3, 1, 0, ["KeyError: 1"]).line()
