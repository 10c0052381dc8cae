"""A WAV file whose header a recorder, cut off from power, never finished."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import BinaryIO

_LARGEST_SIZE = 0xFFFFFFFF
_FIRST_CHUNK = 12


class PatchedFile:
    """A file to read from, with some of its bytes replaced."""

    def __init__(self, file: BinaryIO, at: int, patch: bytes) -> None:
        self._file, self._at, self._patch = file, at, patch

    def seek(self, offset: int, whence: int = 0) -> int:
        """As of any file."""
        return self._file.seek(offset, whence)

    def tell(self) -> int:
        """As of any file."""
        return self._file.tell()

    def read(self, size: int = -1) -> bytes:
        """As of any file, with the patch laid over it."""
        first = self._file.tell()
        data = bytearray(self._file.read(size))
        for i, value in enumerate(self._patch, start=self._at - first):
            if 0 <= i < len(data):
                data[i] = value
        return bytes(data)

    def write(self, _data: bytes) -> int:
        """Nothing is ever written; libsndfile asks that it could."""
        return 0


@contextmanager
def mended_wav(path: Path) -> Iterator[PatchedFile | None]:
    """The file with its data up to the end of the file, where its header still says zero length.

    None where that is not what is wrong, or nothing follows the header.
    """
    with path.open("rb") as file:
        at = _unfinished_size(file)
        held = path.stat().st_size - (at or 0) - 4
        if at is None or held <= 0:
            yield None
        else:
            yield PatchedFile(file, at, min(held, _LARGEST_SIZE).to_bytes(4, "little"))


def _unfinished_size(file: BinaryIO) -> int | None:
    """Where the length of the data stands in the file, if it is zero; leaves the file at 0."""
    head = file.read(_FIRST_CHUNK)
    at = _FIRST_CHUNK if head[:4] == b"RIFF" and head[8:12] == b"WAVE" else None
    while at is not None:
        file.seek(at)
        head = file.read(8)
        size = int.from_bytes(head[4:], "little")
        if head[:4] == b"data" or len(head) < 8:
            file.seek(0)
            return at + 4 if len(head) == 8 and size == 0 else None
        at += 8 + size + size % 2
    return None
