"""Pictures at both sizes, written as SVG: the real app on the real sample job, all six views, and a
guided tap test on the practice rig in real time.

Usage: python docs/make_screenshots.py [JOB] [FOLDER]
"""

from __future__ import annotations

import asyncio
import os
import shutil
import sys
import tempfile
from collections.abc import Callable
from pathlib import Path

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

from textual.pilot import Pilot

from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.capture.bench import Bench
from fieldkit.ui.capture.setup_screen import SetupScreen
from fieldkit.ui.capture.tap_screen import TapScreen
from fieldkit.ui.desk import STEPS

ROOT = Path(__file__).resolve().parent.parent
JOB = ROOT / "samples" / "glycol-booster" / "job.toml"
FOLDER = ROOT / "docs" / "screenshots"
SIZES = ((80, 24), (120, 40))
PATIENCE_S = 300


async def finished(app: FieldkitApp, pilot: Pilot[None]) -> None:
    """Wait for the whole chain; a job that fails ends the script with its sentence."""
    for _ in range(PATIENCE_S * 10):
        if app.desk.workup is not None and app.desk.chosen_modes and app.desk.traces:
            return
        if app.desk.failed:
            raise SystemExit(app.desk.failed)
        await pilot.pause(0.1)
    raise SystemExit(f"no result within {PATIENCE_S} s")


async def photograph(job: Path, folder: Path, size: tuple[int, int]) -> None:
    """One picture per view."""
    app = FieldkitApp(job)
    async with app.run_test(size=size) as pilot:
        await finished(app, pilot)
        for number, step in enumerate(STEPS, start=1):
            await pilot.press(str(number))
            await pilot.pause(0.2)
            name = f"{step}-{size[0]}x{size[1]}.svg"
            (folder / name).write_text(app.export_screenshot(), encoding="utf-8")
            print(folder / name)


async def until(pilot: Pilot[None], wanted: Callable[[], bool]) -> None:
    """Wait for something on the screen."""
    for _ in range(PATIENCE_S * 10):
        if wanted():
            return
        await pilot.pause(0.1)
    raise SystemExit(f"the tap test did not go on within {PATIENCE_S} s")


async def photograph_tap_test(job: Path, folder: Path, size: tuple[int, int]) -> None:
    """Set-up, ringing, a double blow, and three good ones on the practice rig."""

    def shoot(name: str) -> None:
        path = folder / f"{name}-{size[0]}x{size[1]}.svg"
        path.write_text(app.export_screenshot(), encoding="utf-8")
        print(path)

    with tempfile.TemporaryDirectory() as place:
        copy = Path(shutil.copytree(job.parent, Path(place) / "job")) / job.name
        app = FieldkitApp(copy)
        app.bench = Bench(list_inputs=lambda: (), presets_path=Path(place) / "presets.toml")
        async with app.run_test(size=size, notifications=False) as pilot:
            await until(pilot, lambda: app.desk.job is not None)
            await pilot.press("m")
            await until(pilot, lambda: isinstance(app.screen, SetupScreen))
            await until(pilot, lambda: not app.screen.looking)
            shoot("guided-setup")
            await pilot.press("g")
            await until(pilot, lambda: isinstance(app.screen, TapScreen))
            screen = app.screen
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


def main(job: Path = JOB, folder: Path = FOLDER) -> None:
    """Every view and the tap test at every size."""
    folder.mkdir(parents=True, exist_ok=True)
    for size in SIZES:
        asyncio.run(photograph(job, folder, size))
        asyncio.run(photograph_tap_test(job, folder, size))


if __name__ == "__main__":
    main(*map(Path, sys.argv[1:3]))
