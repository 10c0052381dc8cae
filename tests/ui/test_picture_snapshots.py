"""Pictures of curves, waterfall, overlay and looks at both sizes, on values that are made up."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from textual.pilot import Pilot
from textual.screen import Screen

from fieldkit.detune.curves import FixCurve, Varied
from fieldkit.detune.fixes import AddSupport
from fieldkit.detune.verdict import JudgedMode, Nearest
from fieldkit.ui.curve_screen import CurveScreen
from fieldkit.ui.looks import CONTRAST, PLAIN, wear
from fieldkit.ui.waterfall_screen import WaterfallScreen
from tests.ui import glycol
from tests.ui.driving import SIZES, until
from tests.ui.test_snapshots import StillApp
from tests.ui.test_waterfall_screen import made as falling

IDS = [f"{columns}x{rows}" for columns, rows in SIZES]
sized = pytest.mark.parametrize("size", SIZES, ids=IDS)
Compare = Callable[..., bool]


def made_curve() -> FixCurve:
    """Two modes that a support in the middle lifts most, out of the band of pump 2x."""
    value = np.linspace(0.3, 5.0, 25)
    lifted = np.sin(np.pi * value / 5.3)
    modes = tuple(
        tuple(
            JudgedMode(hz, 0.93 * hz, 1.07 * hz, way, float(clear))
            for hz, way in ((28 + 45 * up, "vertical"), (36 + 50 * up, "lateral"))
        )
        for up, clear in zip(lifted.tolist(), lifted > 0.8, strict=True)
    )
    return FixCurve(
        Varied("place", "place of the new support", value,
               tuple(AddSupport(x, 4e6, 4e6) for x in value.tolist()), 7),
        np.clip(1.2 * lifted**2, 0.01, 0.99),
        modes,
        tuple(Nearest("pump 2x", 0.3 * up) for up in lifted.tolist()),
        (value > 4.2),
        glycol.DETUNING.bands,
        0.9,
        200.0,
    )  # fmt: skip


class StillCurves(CurveScreen):
    """The curve is there already."""

    def judge(self, _kind: str) -> None:
        """Nothing to work out."""


async def ready(pilot: Pilot[None]) -> StillApp:
    app = pilot.app
    assert isinstance(app, StillApp)
    await until(pilot, lambda: app.desk.job is not None)
    await pilot.pause()
    return app


async def pushed(pilot: Pilot[None], screen: Screen[object]) -> None:
    await pilot.app.push_screen(screen)
    await pilot.pause()


@sized
def test_curves(snap_compare: Compare, size: tuple[int, int]) -> None:
    async def go(pilot: Pilot[None]) -> None:
        app = await ready(pilot)
        screen = StillCurves(app.desk.job, None, glycol.FIXES[0])
        await pushed(pilot, screen)
        screen.take_curve(None, "place", made_curve())
        await pilot.press("right", "right")
        await pilot.pause()

    assert snap_compare(StillApp(), terminal_size=size, run_before=go)


@sized
def test_waterfall(
    snap_compare: Compare, size: tuple[int, int], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("fieldkit.workup.waterfall.waterfall_of", lambda *_: falling())

    async def go(pilot: Pilot[None]) -> None:
        app = await ready(pilot)
        screen = WaterfallScreen(glycol.RUN_ENTRY, app.desk.bands, 200.0)
        await pushed(pilot, screen)
        await until(pilot, lambda: screen.found is not None)
        await pilot.pause()

    assert snap_compare(StillApp(), terminal_size=size, run_before=go)


@sized
@pytest.mark.parametrize("look", [PLAIN.name, CONTRAST.name])
def test_looks(snap_compare: Compare, size: tuple[int, int], look: str) -> None:
    async def go(pilot: Pilot[None]) -> None:
        app = await ready(pilot)
        wear(app, look)
        await pilot.press("5")
        await pilot.pause()

    assert snap_compare(StillApp(), terminal_size=size, run_before=go)


@sized
def test_the_free_view_of_a_swinging_mode(snap_compare: Compare, size: tuple[int, int]) -> None:
    async def go(pilot: Pilot[None]) -> None:
        await ready(pilot)
        await pilot.press("3", "shift+right", "shift+up", "right")
        await pilot.pause()

    assert snap_compare(StillApp(), terminal_size=size, run_before=go)
