"""Where the lines of a text file begin, found without holding the file in memory."""

from __future__ import annotations

import codecs
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import BinaryIO

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import InputError, Place

LONGEST_LINE_BYTES = 2**22
"""No row of numbers is as long."""
_CHUNK_BYTES = 2**20


@dataclass(frozen=True)
class LineIndex:
    """Lines of a file in UTF-8 or Latin-1."""

    starts: NDArray[np.uint32]
    """(lines,) first byte of each."""
    size: int
    """Bytes in all."""
    encoding: str
    lone_returns: bool
    """Whether a carriage return ends a line by itself."""


def index_lines(file: BinaryIO, path: Path) -> LineIndex:
    """Go through a file once, from its start; what is not UTF-8 is Latin-1.

    Raises InputError where it is empty or blank, holds binary data, or a line is endless.
    """
    file.seek(0)
    utf8 = codecs.getincrementaldecoder("utf-8")()
    valid, blank, lone, size, last = True, True, False, 0, b""
    starts = [np.zeros(1, np.uint32)]
    for chunk in _chunks(file):
        if b"\0" in chunk:
            raise InputError(
                "the file holds binary data, not text", "give WAV, FLAC, AIFF or CSV", Place(path)
            )
        valid = valid and _decodes(utf8, chunk)
        blank = blank and not chunk.strip(b" \t\r\n\v\f\xef\xbb\xbf")
        lone = lone or _has_lone_return(last, chunk)
        starts.append(_line_starts(chunk, size))
        size, last = size + len(chunk), chunk[-1:]
    if blank:
        raise InputError("the file is empty", "export the recording again", Place(path))
    every = np.concatenate(starts)
    _check_lengths(every, size, path)
    file.seek(0)
    if file.read(3) == codecs.BOM_UTF8:
        every[0] = len(codecs.BOM_UTF8)
    valid = valid and _decodes(utf8, b"", last=True)
    return LineIndex(every, size, "utf-8" if valid else "latin-1", lone or last == b"\r")


def _chunks(file: BinaryIO) -> Iterator[bytes]:
    while chunk := file.read(_CHUNK_BYTES):
        yield chunk


def _decodes(decoder: codecs.IncrementalDecoder, chunk: bytes, *, last: bool = False) -> bool:
    try:
        decoder.decode(chunk, last)
    except UnicodeDecodeError:
        return False
    return True


def _has_lone_return(before: bytes, chunk: bytes) -> bool:
    """Whether a carriage return, the byte before the chunk included, has no line feed after it."""
    if before == b"\r" and not chunk.startswith(b"\n"):
        return True
    ends = chunk.endswith(b"\r")
    return chunk.count(b"\r") - chunk.count(b"\r\n") > ends


def _line_starts(chunk: bytes, offset: int) -> NDArray[np.uint32]:
    feeds = np.flatnonzero(np.frombuffer(chunk, np.uint8) == ord("\n"))
    return (feeds + (offset + 1)).astype(np.uint32)


def _check_lengths(starts: NDArray[np.uint32], size: int, path: Path) -> None:
    lengths = np.diff(starts, append=np.uint32(size))
    longest = int(np.argmax(lengths))
    if lengths[longest] > LONGEST_LINE_BYTES:
        raise InputError(
            f"the line is {lengths[longest] / 2**20:.0f} MiB long",
            "give one row of numbers to a line",
            Place(path, longest + 1),
        )
