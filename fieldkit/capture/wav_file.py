"""A WAV file that is whole after every write.

Written here and not through libsndfile because of what that leaves behind: killed in the middle, a
FLAC or RF64 file has no length, so that libsndfile itself cannot read it, and a full disk is told
without saying that it was the disk (libsndfile 1.2.2).
"""

from __future__ import annotations

import io
import struct
from contextlib import suppress
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

BYTES_PER_SAMPLE = 3
_HEADER = struct.Struct("<4sI4s4sIHHIIHH4sI")
_STEPS = 1 << 23


class WavFile:
    """24-bit samples, appended frame by frame; the header tells the length after every append."""

    def __init__(self, path: Path, *, rate_hz: int, channels: int) -> None:
        """Create the file; raises FileExistsError where there is one, OSError where it fails."""
        self.frames = 0
        self._rate_hz = rate_hz
        self._channels = channels
        self._file: io.FileIO = path.open("xb", buffering=0)
        try:
            self._write(self._header())
        except OSError:
            self._file.close()
            path.unlink()
            raise

    def append(self, samples: NDArray[np.floating]) -> None:
        """Append (n, channels) of full scale 1; raises OSError, the file then as it was before."""
        before = self.frames
        try:
            self._write(pcm_24(samples))
            self.frames += len(samples)
            self._file.seek(0)
            self._write(self._header())
            self._file.seek(0, io.SEEK_END)
        except OSError:
            self.frames = before
            with suppress(OSError):
                self._file.truncate(_HEADER.size + self._size())
            raise

    def close(self) -> None:
        """Close it; raises OSError where the last bytes did not reach the disk."""
        try:
            if self._size() % 2:
                self._write(b"\0")
        finally:
            self._file.close()

    def fileno(self) -> int:
        """Its descriptor, to be synchronised with the disk."""
        return self._file.fileno()

    def _size(self) -> int:
        return self.frames * self._channels * BYTES_PER_SAMPLE

    def _header(self) -> bytes:
        frame = self._channels * BYTES_PER_SAMPLE
        return _HEADER.pack(
            b"RIFF", 36 + self._size() + self._size() % 2, b"WAVE",
            b"fmt ", 16, 1, self._channels, self._rate_hz, self._rate_hz * frame, frame,
            8 * BYTES_PER_SAMPLE,
            b"data", self._size(),
        )  # fmt: skip

    def _write(self, data: bytes) -> None:
        rest = memoryview(data)
        while rest:
            rest = rest[self._file.write(rest) or 0 :]


def pcm_24(samples: NDArray[np.floating]) -> bytes:
    """Samples of full scale 1 as little-endian 24-bit numbers, beyond full scale at the rail."""
    steps = np.clip(np.rint(np.asarray(samples, float) * _STEPS), -_STEPS, _STEPS - 1)
    words = np.ascontiguousarray(steps.astype("<i4"))
    return words.view(np.uint8).reshape(-1, 4)[:, :BYTES_PER_SAMPLE].tobytes()
