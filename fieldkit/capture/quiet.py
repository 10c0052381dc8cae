"""Keep what audio libraries print off the screen.

PortAudio, ALSA and JACK write to file descriptor 2, where an app may be drawing. While they are
kept quiet, the descriptor leads to a hidden file and everything that Python writes to standard
error goes on to where it went before.
"""

from __future__ import annotations

import io
import os
import sys
import tempfile
import threading
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from typing import Any, TextIO

_STDERR = 2
_MOST_BYTES = 256 * 1024
_NAMES = ("stderr", "__stderr__")


class _Redirection:
    """Descriptor 2 turned aside for the whole process."""

    def __init__(self) -> None:
        self._flush()
        self.messages = tempfile.TemporaryFile(mode="a+b", buffering=0)  # noqa: SIM115
        self._kept = os.dup(_STDERR)
        self._before = {name: getattr(sys, name) for name in _NAMES}
        self._after = {name: self._elsewhere(stream) for name, stream in self._before.items()}
        os.dup2(self.messages.fileno(), _STDERR)
        for name, stream in self._after.items():
            setattr(sys, name, stream)

    def _elsewhere(self, stream: Any) -> Any:
        """The same stream on the kept descriptor, where it wrote to descriptor 2."""
        try:
            if stream is None or stream.fileno() != _STDERR:
                return stream
        except (OSError, ValueError, AttributeError):
            return stream
        return _on(self._kept, stream)

    def undo(self) -> None:
        self._flush()
        for name, stream in self._after.items():
            if getattr(sys, name) is stream:
                setattr(sys, name, self._before[name])
        os.dup2(self._kept, _STDERR)
        os.close(self._kept)
        self.messages.close()

    def _flush(self) -> None:
        for name in _NAMES:
            with suppress(Exception):
                getattr(sys, name).flush()


def _on(descriptor: int, like: TextIO) -> TextIO:
    return io.TextIOWrapper(
        io.FileIO(descriptor, "wb", closefd=False),
        encoding=like.encoding,
        errors=like.errors,
        line_buffering=True,
        write_through=True,
    )


_lock = threading.Lock()
_users = 0
_redirection: _Redirection | None = None


@contextmanager
def libraries_kept_quiet() -> Iterator[None]:
    """While inside, what libraries print on descriptor 2 is caught; may be nested and shared.

    An app that draws on standard error enters before it starts to draw.
    """
    global _users, _redirection
    with _lock:
        _users += 1
        if _redirection is None:
            with suppress(OSError):
                _redirection = _Redirection()
    try:
        yield
    finally:
        with _lock:
            _users -= 1
            if _users == 0 and _redirection is not None:
                _redirection.undo()
                _redirection = None


def caught_messages() -> str:
    """What was caught since it was last asked for; kept short, whatever the libraries print."""
    with _lock:
        if _redirection is None:
            return ""
        file = _redirection.messages
        size = file.seek(0, io.SEEK_END)
        file.seek(max(0, size - _MOST_BYTES))
        text = file.read()
        file.truncate(0)
    return text.decode("utf-8", "replace")
