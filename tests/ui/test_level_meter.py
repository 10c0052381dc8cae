"""The level meters: every channel is on the screen, its clip lamp among it."""

from __future__ import annotations

from fieldkit.capture.meter import ChannelLevel
from fieldkit.ui.capture.level_meter import meters

QUIET, LOUD = ChannelLevel(0.01, 0.1, False, 0), ChannelLevel(1.0, 1.0, True, 3)
LABELS = ["1 vert", "2 lat", "3 ax", "4 force"]


def test_more_channels_than_rows_stand_beside_each_other() -> None:
    """A clipped fourth channel is seen on a screen that has two rows."""
    shown = meters([QUIET, QUIET, QUIET, LOUD], LABELS, 78, {0: 0.05}, rows=2).plain.splitlines()
    assert len(shown) == 2
    assert all(len(line) <= 78 for line in shown)
    assert "4 force" in shown[1]
    assert "CLIP" in shown[1]
    assert "┊" in shown[0]


def test_few_channels_have_a_row_each() -> None:
    shown = meters([QUIET, LOUD], ["1 vertical", "2 force"], 78, {}, rows=2).plain.splitlines()
    assert [line.split()[1] for line in shown] == ["vertical", "force"]
    assert "CLIPPED" in shown[1]
