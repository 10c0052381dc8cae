"""An audio file that stays on disk: what it holds, and any stretch of it on request."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import ExitStack, contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.audio_file import (
    UNKNOWN_LENGTH_FRAMES,
    coding_notes,
    empty,
    ending_notes,
    filled_frames,
    is_integer,
    open_audio,
)

Real = NDArray[np.float64]
Read = Callable[[int, int], Real]
"""Samples (past - first,) of one channel from two frame numbers."""

_CHUNK_SAMPLES = 2**16


class BrokenOff(Exception):
    """A file can be decoded up to a frame and no further."""

    def __init__(self, frame: int) -> None:
        super().__init__(f"cannot be decoded beyond frame {frame}")
        self.frame = frame


@dataclass(frozen=True)
class AudioInFile:
    """What an audio file holds, without its samples."""

    path: Path
    frames: int
    """As many as can be read, as far as the file's end tells."""
    channels: int
    rate_hz: float
    integer: bool
    """Whether the samples are stored as whole numbers, which clip at full scale."""
    notes: tuple[str, ...] = ()

    @contextmanager
    def reading(self, channel: int) -> Iterator[Read]:
        """Open the file to read one channel, counted from 1.

        What is handed out raises BrokenOff where decoding fails before the last frame.
        """
        with ExitStack() as opened:
            yield _Cursor(self.path, opened, channel - 1).read


def look_into(path: Path) -> AudioInFile:
    """Facts of an audio file; a file that ends early keeps what can be read, with a note.

    Compressed files are decoded once where their last frame cannot be reached. Raises InputError
    as ``read_audio`` does.
    """
    with open_audio(path) as (audio, mended):
        frames, broke_off = int(audio.frames), False
        if frames >= UNKNOWN_LENGTH_FRAMES or not _last_is_there(path):
            frames, broke_off = _counted(audio)
        notes = (*mended, *ending_notes(audio, frames, broke_off, path), *coding_notes(audio))
        if frames == 0:
            raise empty(path)
        return AudioInFile(
            path, frames, audio.channels, float(audio.samplerate), is_integer(audio), notes
        )


def _last_is_there(path: Path) -> bool:
    """Whether the last frame can be decoded; in a handle of its own, since failing breaks it."""
    import soundfile

    with open_audio(path) as (audio, _):
        try:
            audio.seek(audio.frames - 1)
            return len(audio.read(1)) == 1
        except (soundfile.SoundFileError, OverflowError):
            return False


def _counted(audio: Any) -> tuple[int, bool]:
    """Frames that can be decoded, and whether decoding broke off with an error."""
    import soundfile

    block = np.empty((max(1, _CHUNK_SAMPLES // audio.channels), audio.channels))
    count = 0
    while True:
        block.fill(np.nan)
        try:
            frames = len(audio.read(out=block))
        except soundfile.SoundFileError:
            return count + filled_frames(block), True
        if frames == 0:
            return count, False
        count += frames


class _Cursor:
    """A place in an open file. Failing to decode leaves a file useless: then it is opened anew."""

    def __init__(self, path: Path, opened: ExitStack, column: int) -> None:
        self._path, self._opened, self._column = path, opened, column
        self._open()

    def read(self, first: int, past: int) -> Real:
        """Samples (past - first,) of the channel."""
        self._go_to(first)
        self._at = -1
        samples = _one_channel(self._audio, first, past - first, self._column)
        self._at = past
        return samples

    def _open(self) -> None:
        self._opened.close()
        self._audio, _ = self._opened.enter_context(open_audio(self._path))
        self._at = 0

    def _go_to(self, frame: int) -> None:
        if self._at == frame or self._reached(frame):
            return
        self._open()
        if not self._reached(frame):
            self._open()
            for first in range(0, frame, _CHUNK_SAMPLES):
                _one_channel(self._audio, first, min(_CHUNK_SAMPLES, frame - first), self._column)

    def _reached(self, frame: int) -> bool:
        import soundfile

        try:
            return bool(self._audio.seek(frame) == frame)
        except soundfile.SoundFileError:
            return False


def _one_channel(audio: Any, first: int, count: int, column: int) -> Real:
    """Samples (count,) of one channel from where the file stands, in pieces of all channels."""
    samples = np.empty(count)
    step = max(1, _CHUNK_SAMPLES // audio.channels)
    alone = audio.channels == 1
    chunk = np.empty((0 if alone else min(step, count), audio.channels))
    for done in range(0, count, step):
        size = min(step, count - done)
        piece = samples[done : done + size, None] if alone else chunk[:size]
        frames = _read_into(audio, piece)
        if frames < size:
            raise BrokenOff(first + done + frames)
        if not alone:
            samples[done : done + size] = piece[:, column]
    return samples


def _read_into(audio: Any, piece: Real) -> int:
    """Frames that could be decoded of those that a piece (n, channels) has room for."""
    import soundfile

    piece.fill(np.nan)
    try:
        return len(audio.read(out=piece))
    except soundfile.SoundFileError:
        return filled_frames(piece)
