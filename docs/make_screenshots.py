"""Pictures at both sizes, written as SVG: the real app on the real sample job, from start screen to
recheck, a guided tap test on the practice rig in real time, and the first page of the sheet.

Usage: python docs/make_screenshots.py [JOB] [FOLDER]
"""

from __future__ import annotations

import asyncio
import os
import shutil
import subprocess
import sys
import tempfile
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from unittest.mock import patch

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
os.environ["FIELDKIT_MOTION"] = "off"

from make_retap import main as make_retap
from textual.pilot import Pilot
from textual.screen import Screen
from textual.widgets import Input

from fieldkit.job import journal, recent
from fieldkit.job.draft import Draft
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.capture.bench import Bench
from fieldkit.ui.capture.setup_screen import SetupScreen
from fieldkit.ui.capture.tap_screen import TapScreen
from fieldkit.ui.chance_screen import ChanceScreen
from fieldkit.ui.curve_screen import CurveScreen
from fieldkit.ui.desk import STEPS
from fieldkit.ui.recheck_screen import RecheckScreen
from fieldkit.ui.start.guided import GuidedScreen
from fieldkit.ui.start.start_screen import StartScreen
from fieldkit.ui.waterfall_screen import WaterfallScreen
from fieldkit.ui.worked_screen import WorkedScreen

ROOT = Path(__file__).resolve().parent.parent
JOB = ROOT / "samples" / "glycol-booster" / "job.toml"
FOLDER = ROOT / "docs" / "screenshots"
SIZES = ((80, 24), (120, 40))
PATIENCE_S = 300
CLOCK = "today 14:05"
PAGE_WIDTH, PAGE_HEIGHT = 900, 1150
DRAFT = Draft(
    pipe={"title": "Glycol booster", "size": "NPS 4", "schedule": "40", "tapped": "drained"},
    rows={
        "leg": ({"direction": "+x", "length": "3.40 m"},),
        "support": (
            {"at": "0 m", "kind": "anchor"},
            {"at": "1.70 m", "kind": "clamp", "vertical": "unknown", "lateral": "unknown"},
        ),
    },
    half={"support": {"at": "3.40 m", "kind": "gui"}},
    step=2,
)
"""The sample as it is being described, at its third support."""

Shot = Callable[[str], None]


class QuietApp(FieldkitApp):
    """The app without a job: nothing is worked out behind a picture."""

    def warm_libraries(self) -> None:  # type: ignore[override]
        """No thread."""


def camera(app: FieldkitApp, folder: Path, size: tuple[int, int]) -> Shot:
    """What writes the screen as it is now under a name."""

    def shoot(name: str) -> None:
        for cursor in app.screen.query(Input):
            cursor.cursor_blink = False
        path = folder / f"{name}-{size[0]}x{size[1]}.svg"
        path.write_text(app.export_screenshot(), encoding="utf-8")
        print(path, flush=True)

    return shoot


async def until(pilot: Pilot[None], wanted: Callable[[], bool]) -> None:
    """Wait for something on the screen; a job that fails ends the script with its sentence."""
    for _ in range(PATIENCE_S * 10):
        if wanted():
            await pilot.pause(0.2)
            return
        app = pilot.app
        if isinstance(app, FieldkitApp) and app.desk.failed:
            raise SystemExit(app.desk.failed)
        await pilot.pause(0.1)
    raise SystemExit(f"the app did not go on within {PATIENCE_S} s")


async def shown(pilot: Pilot[None], kind: type[Screen[object]]) -> None:
    """Wait for a window with its answer in it."""
    await until(pilot, lambda: isinstance(pilot.app.screen, kind))
    screen = pilot.app.screen
    if hasattr(screen, "found"):
        await until(pilot, lambda: screen.found is not None)


async def photograph_views(job: Path, folder: Path, size: tuple[int, int]) -> None:
    """One picture of each view, and of each window over them."""
    app = FieldkitApp(job)
    async with app.run_test(size=size, notifications=False) as pilot:
        shoot = camera(app, folder, size)
        await until(pilot, lambda: bool(app.desk.chosen_modes and app.desk.traces))
        await until(pilot, lambda: not app.desk.working)
        for number, step in enumerate(STEPS, start=1):
            await pilot.press(str(number))
            await pilot.pause(0.3)
            shoot(step)
        for view, key, name, kind in (
            ("2", "h", "waterfall", WaterfallScreen),
            ("5", "m", "map", ChanceScreen),
            ("5", "c", "curve", CurveScreen),
            ("5", "i", "install", WorkedScreen),
        ):
            await pilot.press(view, key)
            await shown(pilot, kind)
            shoot(name)
            await pilot.press("escape")
            await pilot.pause(0.2)
        await photograph_recheck(app, pilot, shoot)


async def photograph_recheck(app: FieldkitApp, pilot: Pilot[None], shoot: Shot) -> None:
    """The first change as it was promised, held against taps made after it."""
    with tempfile.TemporaryDirectory() as place:
        make_retap(Path(place))
        assert app.desk.workup is not None
        assert app.desk.chosen is not None
        files = tuple(sorted(Path(place).glob("*.flac")))
        await app.push_screen(RecheckScreen(app.desk.workup, app.desk.chosen, files))
        await shown(pilot, RecheckScreen)
        shoot("recheck")


@contextmanager
def someone_at_home(job: Path) -> Iterator[Path]:
    """A home of its own with two jobs opened before and one half described; its folder of work."""
    with tempfile.TemporaryDirectory() as place:
        home, site = Path(place), Path(place) / "site"
        settings = {"HOME": place, "XDG_STATE_HOME": str(home / "state")}
        with (
            patch.dict(os.environ, settings),
            patch("fieldkit.ui.start.start_screen.when", lambda _moment: CLOCK),
        ):
            for name, said in (("small-bore", ""), (job.parent.name, "6 taps, best fix 96 %")):
                copy = shutil.copytree(job.parent.parent / name, site / name) / "job.toml"
                recent.remember(copy, said)
            half = {"rows": {"leg": [{}, {}]}}
            journal.keep(journal.Kept("new-1", title="Suction line", draft=half))
            yield site


async def photograph_start(job: Path, folder: Path, size: tuple[int, int]) -> None:
    """The start screen, and a new job at its third step."""
    with someone_at_home(job) as site:
        app = QuietApp()
        async with app.run_test(size=size, notifications=False) as pilot:
            shoot = camera(app, folder, size)
            await until(pilot, lambda: isinstance(app.screen, StartScreen))
            first = app.screen
            assert isinstance(first, StartScreen)
            await until(pilot, lambda: len(first.told) == len(first.recent))
            shoot("start")
            screen = GuidedScreen(DRAFT, site)
            await app.push_screen(screen)
            await until(pilot, lambda: screen.pane is not None)
            await until(pilot, lambda: screen.pane.fields.here is not None)
            screen.pane.fields.focus_on("kind")
            await pilot.press("end")
            await pilot.pause(0.3)
            shoot("new-job")


async def photograph_tap_test(job: Path, folder: Path, size: tuple[int, int]) -> None:
    """Set-up, ringing, a double blow, and three good ones on the practice rig."""
    with tempfile.TemporaryDirectory() as place:
        copy = Path(shutil.copytree(job.parent, Path(place) / "job")) / job.name
        app = FieldkitApp(copy)
        shoot = camera(app, folder, size)
        app.bench = Bench(list_inputs=lambda: (), presets_path=Path(place) / "presets.toml")
        async with app.run_test(size=size, notifications=False) as pilot:
            await until(pilot, lambda: app.desk.job is not None)
            await pilot.press("m")
            await until(pilot, lambda: isinstance(app.screen, SetupScreen))
            await until(pilot, lambda: not app.screen.looking)
            shoot("guided-setup")
            await pilot.press("g")
            await until(pilot, lambda: isinstance(app.screen, TapScreen))
            await photograph_blows(app.screen, pilot, shoot)


async def photograph_blows(screen: TapScreen, pilot: Pilot[None], shoot: Shot) -> None:
    """Four blows, the second of them a double one."""
    await until(pilot, lambda: screen.run is not None)
    for blows, fault in ((1, ""), (2, "double"), (3, ""), (4, "")):
        await until(pilot, lambda: screen.run.look().guide.phase == "armed")
        screen.run.strike(fault)
        if blows == 1:
            await pilot.pause(0.8)
            shoot("guided-ringing")
        await until(pilot, lambda n=blows: len(screen.run.look().guide.blows) == n)
        if fault:
            await pilot.pause(0.3)
            shoot("guided-double")
    await until(pilot, lambda: not screen.run.look().guide.estimating)
    await until(pilot, lambda: screen.run.look().guide.phase == "armed")
    await pilot.pause(2.0)
    shoot("guided-enough")
    screen.run.stop()
    screen.run.session.join(PATIENCE_S)


def photograph_sheet(job: Path, folder: Path) -> None:
    """The top of the sheet in a browser, where there is one."""
    browser = shutil.which("chromium") or shutil.which("chromium-browser")
    if browser is None:
        print("no chromium: the sheet is not pictured anew")
        return
    with tempfile.TemporaryDirectory() as place:
        page, picture = Path(place) / "sheet.html", folder / "sheet-page.png"
        program = [sys.executable, "-m", "fieldkit", "sheet", str(job), "-o", str(page)]
        subprocess.run(program, check=True, stdout=subprocess.DEVNULL, cwd=ROOT)
        look = ("--headless", "--no-sandbox", "--disable-gpu", "--hide-scrollbars",
                f"--user-data-dir={place}/profile", f"--window-size={PAGE_WIDTH},{PAGE_HEIGHT}",
                f"--screenshot={picture}")  # fmt: skip
        subprocess.run([browser, *look, page.as_uri()], check=True, capture_output=True)
        print(picture)


def main(job: Path = JOB, folder: Path = FOLDER) -> None:
    """Every picture at every size."""
    folder.mkdir(parents=True, exist_ok=True)
    for size in SIZES:
        asyncio.run(photograph_start(job, folder, size))
        asyncio.run(photograph_views(job, folder, size))
        asyncio.run(photograph_tap_test(job, folder, size))
    photograph_sheet(job, folder)


if __name__ == "__main__":
    main(*map(Path, sys.argv[1:3]))
