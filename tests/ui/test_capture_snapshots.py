"""The live screen at both sizes, from a moment that is written down."""

from __future__ import annotations

from collections.abc import Callable

import pytest
from textual.pilot import Pilot

from fieldkit.ui.capture.tap_screen import TapScreen
from tests.ui.capturing import Host, until
from tests.ui.made_look import StillRun, look


@pytest.mark.parametrize("size", [(80, 24), (120, 40)], ids=["80x24", "120x40"])
def test_the_guided_tap_test_looks_as_it_did(
    snap_compare: Callable[..., bool], size: tuple[int, int]
) -> None:
    app = Host(lambda: TapScreen(lambda: StillRun(look()), "Beam", "SI"))  # type: ignore[arg-type, return-value]

    async def go(pilot: Pilot[None]) -> None:
        screen = app.screen
        assert isinstance(screen, TapScreen)
        await until(pilot, lambda: screen.run is not None)
        screen.poll()
        screen._verdict_frame = 0  # the verdict in large letters is over
        screen.poll()
        await pilot.pause()

    assert snap_compare(app, terminal_size=size, run_before=go)
