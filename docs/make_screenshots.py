"""Pictures of all six views at both sizes: the real app on the real sample job, written as SVG.

Usage: python docs/make_screenshots.py [JOB] [FOLDER]
"""

from __future__ import annotations

import asyncio
import os
import sys
from pathlib import Path

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

from textual.pilot import Pilot

from fieldkit.ui.app import FieldkitApp
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


def main(job: Path = JOB, folder: Path = FOLDER) -> None:
    """Every view at every size."""
    folder.mkdir(parents=True, exist_ok=True)
    for size in SIZES:
        asyncio.run(photograph(job, folder, size))


if __name__ == "__main__":
    main(*map(Path, sys.argv[1:3]))
