"""The program in a terminal of its own, typed to and read: what a person has before them."""

from __future__ import annotations

import fcntl
import os
import pty
import re
import select
import signal
import struct
import subprocess
import sys
import termios
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

LONGEST_S = 60.0
_STEERING = re.compile(
    rb"\x1b\[[0-?]*[ -/]*[@-~]|\x1b\][^\x07\x1b]*(?:\x07|\x1b\\)|\x1b[P_^].*?\x1b\\|\x1b."
)


def _at_the_terminal() -> None:
    """In the child: a session of its own, which a hang-up ends even where ours ignores it."""
    fcntl.ioctl(0, termios.TIOCSCTTY, 0)
    signal.signal(signal.SIGHUP, signal.SIG_DFL)


class Terminal:
    """A pseudo terminal; ``seen`` is everything written to it since it was last looked at."""

    def __init__(self, arguments: list[str], folder: Path, state: Path) -> None:
        self.master, slave = pty.openpty()
        fcntl.ioctl(slave, termios.TIOCSWINSZ, struct.pack("HHHH", 24, 80, 0, 0))
        environment = os.environ | {
            "XDG_STATE_HOME": str(state),
            "TERM": "xterm-256color",
            "PYTHONPATH": str(Path(__file__).parents[2]),
        }
        self.process = subprocess.Popen(
            [sys.executable, "-m", "fieldkit", *arguments],
            stdin=slave, stdout=slave, stderr=slave, cwd=folder, env=environment,
            start_new_session=True, preexec_fn=_at_the_terminal,
        )  # fmt: skip
        os.close(slave)
        self.written = b""

    def type(self, keys: str) -> None:
        """Press keys."""
        os.write(self.master, keys.encode())

    def until(self, text: str) -> None:
        """Read until a text was drawn since the last time."""
        give_up = time.monotonic() + LONGEST_S
        while text not in self.seen:
            if not self._read(give_up - time.monotonic()):
                raise AssertionError(f"{text!r} never came; the screen says {self.seen[-3000:]!r}")
        self.written = b""

    @property
    def seen(self) -> str:
        """What was drawn, without what steers the terminal."""
        return _STEERING.sub(b"", self.written).decode("utf-8", "replace")

    def _read(self, patience_s: float) -> bool:
        ready, _, _ = select.select([self.master], [], [], max(0.0, patience_s))
        if not ready:
            return False
        try:
            fresh = os.read(self.master, 65536)
        except OSError:
            return False
        self.written += fresh
        return bool(fresh)

    def kill(self) -> None:
        """As a crash does: no warning, nothing tidied up."""
        self.process.send_signal(signal.SIGKILL)
        self.process.wait()

    def hang_up(self) -> None:
        """As a line that drops does."""
        os.close(self.master)
        self.master = -1
        self.process.wait(timeout=LONGEST_S)


@contextmanager
def terminal(arguments: list[str], folder: Path, state: Path) -> Iterator[Terminal]:
    """The program, ended in the end."""
    shown = Terminal(arguments, folder, state)
    try:
        yield shown
    finally:
        if shown.process.poll() is None:
            shown.kill()
        if shown.master >= 0:
            os.close(shown.master)
