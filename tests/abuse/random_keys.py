"""Random keys and sizes for the app: ``python -m tests.abuse.random_keys --minutes 10 --seed 1``.

The real app on a real job, worked out by the real chain. At the end it must still save; nothing may
have gone wrong inside it on the way.
"""

from __future__ import annotations

import argparse
import asyncio
import contextlib
import os
import random
import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from pathlib import Path
from unittest.mock import patch

from textual.events import Key
from textual.keys import _character_to_key
from textual.pilot import Pilot

from fieldkit.job.schema import load_job
from fieldkit.ui import work
from fieldkit.ui.app import FieldkitApp
from tests.abuse.case import JOB

MOVES = (
    *("up", "down", "left", "right", "tab", "shift+tab", "enter", "escape", "space", "home", "end"),
    *("pageup", "pagedown", "backspace", "delete", "f1", "ctrl+s", "ctrl+z", "ctrl+y", "ctrl+p"),
    *("shift+up", "shift+down", "ctrl+a", "ctrl+u"),
)
VIEWS = ("1", "2", "3", "4", "5", "6")
LETTERS = (*"abcdefghijklmnoprstuvwxyzABCDEFGHIJKLMNOPRSTUVWXYZ0789+-?, []é漢😀",)
"""No point, slash or tilde: files are saved in the folder of the run. No q: it only leaves."""
SIZES = ((80, 24), (120, 40), (200, 60), (40, 12), (20, 5), (1, 1), (300, 10), (81, 33), (10, 100))


@dataclass
class Played:
    """What a run came to."""

    keys: int = 0
    resizes: int = 0
    left: int = 0
    """Times the app was left and opened again."""
    wrong: list[str] = field(default_factory=list)
    saved: bool = False

    def line(self) -> str:
        """In one line."""
        ending = "it still saves" if self.saved else "it no longer saves"
        return (
            f"{self.keys} keys, {self.resizes} changes of size, left {self.left} times: "
            f"{len(self.wrong)} exceptions, {ending}"
        )


async def played(
    folder: Path, rng: random.Random, go_on: Callable[[Played], bool], text: str = JOB
) -> Played:
    """Play for as long as ``go_on`` says, then change the job and save it."""
    job = folder / "job.toml"
    told = Played()
    with inside(folder), faults_noted(told):
        while go_on(told):
            job.write_text(text, "utf-8")
            app = FieldkitApp(job)
            async with app.run_test(size=rng.choice(SIZES)) as pilot:
                while go_on(told) and app.is_running and not told.wrong:
                    await _play(pilot, rng, told)
            told.left += app.return_code is not None and go_on(told)
            if told.wrong:
                return told
        job.write_text(text, "utf-8")
        async with FieldkitApp(job).run_test(size=(80, 24)) as pilot:
            told.saved = await _saves(pilot, rng, told, job)
    return told


async def _play(pilot: Pilot[None], rng: random.Random, told: Played) -> None:
    if rng.random() < 0.02:
        await pilot.resize_terminal(*rng.choice(SIZES))
        told.resizes += 1
        return
    kinds, weights = (MOVES, VIEWS, LETTERS), (6, 1, 5)
    pilot.app.post_message(_pressed(rng.choice(rng.choices(kinds, weights)[0])))
    await pilot.pause(rng.choice((0.0, 0.0, 0.02)))
    told.keys += 1


def _pressed(key: str) -> Key:
    """A key without the pause that a test usually waits for after it."""
    return Key(_character_to_key(key), key) if len(key) == 1 else Key(key, None)


async def _saves(pilot: Pilot[None], rng: random.Random, told: Played, job: Path) -> bool:
    """After some more keys, every window is closed, the title changed, and the file looked at."""
    app = pilot.app
    assert isinstance(app, FieldkitApp)
    for _ in range(20):
        await _play(pilot, rng, told)
    await pilot.resize_terminal(80, 24)
    while len(app.screen_stack) > 1:
        app.pop_screen()
        await pilot.pause(0.01)
    await until(pilot, lambda: app.open_job is not None)
    opened = app.open_job
    assert opened is not None
    app.change_text(lambda: opened.text.with_value("title", "Still here"))
    await pilot.pause(0.01)
    target = opened.path or job
    await app.save_somewhere(target)
    await until(pilot, lambda: "Still here" in target.read_text("utf-8"))
    return load_job(target).title == "Still here"


async def until(pilot: Pilot[None], wanted: Callable[[], bool]) -> None:
    """Handle messages until something holds."""
    for _ in range(2000):
        if wanted():
            return
        await pilot.pause(0.01)
    raise AssertionError("it never came")


@contextlib.contextmanager
def inside(folder: Path) -> Iterator[None]:
    """The app keeps and finds its things in one folder, and edits files with nothing."""
    names = ("HOME", "XDG_STATE_HOME", "XDG_DATA_HOME", "XDG_CONFIG_HOME", "XDG_CACHE_HOME")
    apart = {name: str(folder / "home") for name in names} | {"EDITOR": "true", "VISUAL": "true"}
    with patch.dict(os.environ, apart), contextlib.chdir(folder):
        yield


@contextlib.contextmanager
def faults_noted(told: Played) -> Iterator[None]:
    """Whatever the app would tell as a fault of its own is noted."""
    plain = work.unexpected

    def noted(error: Exception) -> str:
        told.wrong.append(f"{type(error).__name__}: {error}")
        return plain(error)

    with patch.object(work, "unexpected", noted):
        yield


def main() -> None:
    """Play and print the line; exit status 1 where anything went wrong."""
    asked = argparse.ArgumentParser(description=__doc__)
    asked.add_argument("--minutes", type=float, default=10.0)
    asked.add_argument("--seed", type=int, default=1)
    options = asked.parse_args()
    end = time.monotonic() + 60 * options.minutes
    with tempfile.TemporaryDirectory() as name:
        run = played(Path(name), random.Random(options.seed), lambda _: time.monotonic() < end)
        told = asyncio.run(run)
    sys.stdout.write("".join(f"FAILED {fault}\n" for fault in told.wrong) + told.line() + "\n")
    sys.exit(int(bool(told.wrong) or not told.saved))


if __name__ == "__main__":
    main()
