"""The installed program in a real terminal multiplexer: typed to by keys, its screen read back."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import time
from collections.abc import Iterator
from pathlib import Path

import pytest

from fieldkit.job.schema import load_job

TMUX = shutil.which("tmux")
PROGRAM = Path(sys.executable).with_name("fieldkit")
LONGEST_S = 90.0

if TMUX is None and os.environ.get("FIELDKIT_REQUIRE_TMUX") == "1":
    raise RuntimeError("FIELDKIT_REQUIRE_TMUX=1, and there is no tmux: install it")
pytestmark = [
    pytest.mark.skipif(TMUX is None, reason="tmux is not installed"),
    pytest.mark.skipif(not PROGRAM.exists(), reason="fieldkit is not installed beside Python"),
]


class Multiplexer:
    """A tmux server of its own, with the program in its only window."""

    def __init__(self, folder: Path, socket: Path, size: tuple[int, int]) -> None:
        self.socket = socket
        columns, rows = size
        environment = {
            "XDG_STATE_HOME": str(folder / "home"),
            "EDITOR": "no-such-editor",
            "VISUAL": "",
            "OPENBLAS_NUM_THREADS": "1",
        }
        given = [f"{name}={value}" for name, value in environment.items()]
        self._tmux(
            "new-session", "-d", "-x", str(columns), "-y", str(rows), "-c", str(folder),
            "env", *given, str(PROGRAM),
        )  # fmt: skip

    def _tmux(self, *arguments: str) -> str:
        assert TMUX is not None
        command = [TMUX, "-S", str(self.socket), "-f", "/dev/null", *arguments]
        return subprocess.run(command, capture_output=True, text=True, check=True).stdout

    def press(self, *keys: str) -> None:
        """Keys by their tmux names."""
        self._tmux("send-keys", *keys)

    def type(self, *texts: str) -> None:
        """Each text as it stands, with Enter behind it."""
        for text in texts:
            if text:
                self._tmux("send-keys", "-l", text)
            self.press("Enter")

    @property
    def screen(self) -> str:
        """What is on the screen now."""
        return self._tmux("capture-pane", "-p")

    def until(self, text: str) -> str:
        """The screen as soon as it holds a text."""
        give_up = time.monotonic() + LONGEST_S
        while time.monotonic() < give_up:
            shown = self.screen
            if text in shown:
                return shown
            time.sleep(0.05)
        raise AssertionError(f"{text!r} never came:\n{self.screen}")

    def close(self) -> None:
        """End the server and what runs in it."""
        subprocess.run(
            [str(TMUX), "-S", str(self.socket), "kill-server"], capture_output=True, check=False
        )


@pytest.fixture
def window(tmp_path: Path) -> Iterator[Multiplexer]:
    """The program started in an empty folder at 80x24."""
    folder = tmp_path / "site"
    folder.mkdir()
    shown = Multiplexer(folder, tmp_path / "s", (80, 24))
    yield shown
    shown.close()


def test_a_pipe_is_described_and_saved_from_an_empty_folder(
    window: Multiplexer, tmp_path: Path
) -> None:
    """Start, all six steps, the views, and a file on the disk that reads as it was typed."""
    window.until("Sample job")
    window.press("n")
    window.until("What pipe is it?")
    window.type("Drain line", "", "2", "40")
    window.press("NPage")
    window.until("Which way does it run?")
    window.type("+x", "20' 3\"")
    window.until("6.172 m")
    window.type("")
    window.until("Leg 1  +x, 20' 3\"")
    window.type("")
    window.until("What holds it")
    window.type("st", "anch", "", "")
    window.until("Support 1  at 0 m, anchor")
    window.type("end", "rest", "", "")
    window.until("Support 2")
    window.press("NPage")
    window.until("What heavy things")
    window.press("NPage")
    window.until("What shakes it?")
    window.type("fan", "900 rpm", "9")
    window.until("1, 2, 9 (us")
    window.type("", "")
    window.until("Excitation 1")
    window.press("NPage")
    window.until("What is good enough?")
    window.press("NPage")
    shown = window.until("as described")
    assert "Drain line" in shown
    job = load_job(tmp_path / "site" / "drain-line.toml")
    assert job.span.length_m == pytest.approx(6.1722)
    assert job.excitations[0].orders == (1, 2, 9)
    window.press("y")
    window.until("Shown in US units")
    window.press("u")
    window.until("Taken back: units")
    window.press("E")
    window.until("no-such-editor")
    window.press("q")


def test_the_screen_follows_the_size_of_the_window(window: Multiplexer) -> None:
    """Larger, then small again: every line is there and none is broken."""
    window.until("Sample job")
    window.press("n")
    window.until("What pipe is it?")
    for columns, rows in ((120, 40), (200, 60), (80, 24)):
        window._tmux("resize-window", "-x", str(columns), "-y", str(rows))
        shown = window.until("Next ›")
        assert "6 Goal" in shown
        assert max(len(line) for line in shown.splitlines()) <= columns
