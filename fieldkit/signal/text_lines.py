"""Lines of a text file, whatever wrote it."""

from __future__ import annotations

import codecs
import io
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import BinaryIO, overload

from fieldkit.errors import InputError, Place
from fieldkit.signal.line_index import LineIndex, index_lines

MAX_TEXT_BYTES = 2**29
"""Longest text file that is read."""

_HEAD = 4096
_LINES_AT_ONCE = 1000
_BYTE_ORDER_MARKS = (
    (codecs.BOM_UTF8, "utf-8-sig"),
    (codecs.BOM_UTF32_LE, "utf-32"),
    (codecs.BOM_UTF32_BE, "utf-32"),
    (codecs.BOM_UTF16_LE, "utf-16"),
    (codecs.BOM_UTF16_BE, "utf-16"),
)
_BINARY_CONTROLS = bytes(sorted(set(range(32)) - set(b"\t\n\r\f\v\x1a\x1b")))


def looks_like_text(head: bytes) -> bool:
    """Whether the first bytes of a file are text of some encoding."""
    if not head:
        return False
    if _encoding(head) != "utf-8":
        return True
    return not any(control in head for control in _BINARY_CONTROLS)


class TextLines(Sequence[str]):
    """Lines without their ends, read from the file as they are asked for.

    Line n of an editor is item n - 1. Many are best asked for as a slice.
    """

    def __init__(self, file: BinaryIO, index: LineIndex) -> None:
        self._file, self._index = file, index

    def __len__(self) -> int:
        return len(self._index.starts)

    @overload
    def __getitem__(self, at: int) -> str: ...
    @overload
    def __getitem__(self, at: slice) -> list[str]: ...
    def __getitem__(self, at: int | slice) -> str | list[str]:
        if isinstance(at, slice):
            first, past, step = at.indices(len(self))
            return self._between(first, past)[::step] if first < past and step > 0 else []
        if not -len(self) <= at < len(self):
            raise IndexError(at)
        return self._between(at % len(self), at % len(self) + 1)[0]

    def __iter__(self) -> Iterator[str]:
        for first in range(0, len(self), _LINES_AT_ONCE):
            yield from self[first : first + _LINES_AT_ONCE]

    def _between(self, first: int, past: int) -> list[str]:
        starts = self._index.starts
        end = int(starts[past]) - 1 if past < len(starts) else self._index.size
        self._file.seek(int(starts[first]))
        data = self._file.read(end - int(starts[first]))
        text = data.decode(self._index.encoding, errors="replace")
        return text.replace("\r\n", "\n").removesuffix("\r").split("\n")


@contextmanager
def open_lines(path: Path) -> Iterator[TextLines]:
    """All lines of a text file, which is not held in memory.

    Reads UTF-8, UTF-16 and UTF-32 with or (UTF-16) without byte order mark, and Latin-1, with
    any line end. Raises InputError where the file is empty, too large or not text.
    """
    size = path.stat().st_size
    if size > MAX_TEXT_BYTES:
        raise InputError(
            f"the text file is too large: {size / 2**20:.0f} MiB, and at most "
            f"{MAX_TEXT_BYTES / 2**20:.0f} MiB are read",
            "cut it to the part that matters, or store it as WAV or FLAC",
            Place(path),
        )
    with path.open("rb") as on_disk:
        file: BinaryIO = on_disk
        if not _encoding(file.read(_HEAD)).startswith("utf-8"):
            file = io.BytesIO(_decoded(path.read_bytes(), path).encode())
        index = index_lines(file, path)
        if index.lone_returns:
            file.seek(0)
            file = io.BytesIO(file.read().replace(b"\r\n", b"\n").replace(b"\r", b"\n"))
            index = index_lines(file, path)
        yield TextLines(file, index)


def _decoded(data: bytes, path: Path) -> str:
    encoding = _encoding(data[:_HEAD])
    try:
        return data.decode(encoding)
    except UnicodeDecodeError as error:
        raise InputError(
            f"the text is not valid {encoding.upper()}", "save it as UTF-8", Place(path)
        ) from error


def _encoding(head: bytes) -> str:
    for mark, encoding in _BYTE_ORDER_MARKS:
        if head.startswith(mark):
            return encoding
    pairs = len(head) // 2
    if pairs and head[1 : 2 * pairs : 2].count(0) > 0.9 * pairs and 0 not in head[0::2]:
        return "utf-16-le"
    if pairs and head[0 : 2 * pairs : 2].count(0) > 0.9 * pairs and 0 not in head[1::2]:
        return "utf-16-be"
    return "utf-8"
