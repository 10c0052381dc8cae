"""Killed at any moment, a recording can be read up to half a second before it."""

from __future__ import annotations

from tests.capture.kill_table import kills

TIMES = 6


def test_a_killed_recording_lacks_less_than_half_a_second(bench, tmp_path):
    for killed in kills(bench, tmp_path, TIMES, seed=7):
        assert killed.kept, killed
        assert killed.readable_s == killed.loaded_s
        assert killed.whole
        assert killed.described
