"""Lines of a text file, whatever wrote it."""

from __future__ import annotations

import codecs
from pathlib import Path

from fieldkit.errors import InputError, Place

MAX_TEXT_BYTES = 2**29
"""Longest text file that is read."""

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


def read_lines(path: Path) -> list[str]:
    """All lines without their ends; line n of an editor is item n - 1.

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
    text = _decoded(path.read_bytes(), path)
    if not text.strip():
        raise InputError("the file is empty", "export the recording again", Place(path))
    if "\0" in text:
        raise InputError(
            "the file holds binary data, not text", "give WAV, FLAC, AIFF or CSV", Place(path)
        )
    return text.replace("\r\n", "\n").replace("\r", "\n").split("\n")


def _decoded(data: bytes, path: Path) -> str:
    encoding = _encoding(data[:4096])
    try:
        return data.decode(encoding)
    except UnicodeDecodeError as error:
        if encoding == "utf-8":
            return data.decode("latin-1")
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
