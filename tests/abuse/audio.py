"""Hostile recordings: truncated, wrong headers, sizes that lie, odd codings, odd contents."""

from __future__ import annotations

import struct
from collections.abc import Callable, Iterator
from functools import partial
from pathlib import Path

import numpy as np
import soundfile

from tests.abuse.case import READ, Case, taps

FORMATS = {
    # ending: codings libsndfile writes into it
    "wav": ("PCM_U8", "PCM_16", "PCM_24", "PCM_32", "FLOAT", "DOUBLE", "ULAW", "ALAW", "IMA_ADPCM"),
    "flac": ("PCM_S8", "PCM_16", "PCM_24"),
    "aiff": ("PCM_S8", "PCM_16", "FLOAT"),
    "ogg": ("VORBIS",),
}
CUTS = (0, 1, 3, 4, 11, 12, 20, 36, 43, 44, 45, 47, 100, 301, 2000)
"""Bytes that are left, header and a little more."""
SIZES = {"zero": 0, "one": 1, "odd": 7, "half": 24_000, "open": 0xFFFFFFFF, "large": 0x7FFFFFF0}
FIELDS = {
    # name: place and form in the header of a WAV file, values that lie
    "coding": (20, "<H", (0, 2, 85, 0xFFFE, 0xFFFF)),
    "channels": (22, "<H", (0, 2, 32, 1024, 65535)),
    "rate": (24, "<I", (0, 1, 99, 1_000_000, 0xFFFFFFFF)),
    "block": (32, "<H", (0, 1, 3, 65535)),
    "bits": (34, "<H", (0, 1, 7, 64, 65535)),
    "format size": (16, "<I", (0, 1, 15, 0xFFFFFFFF)),
}
STRANGERS = {
    "text": b"this is a shopping list, not a recording\n" * 20,
    "page": b"<!DOCTYPE html><html><script>alert(1)</script></html>" * 9,
    "zeros": b"\0" * 5000,
    "ones": b"\xff" * 5000,
    "archive": b"PK\x03\x04" + bytes(range(256)) * 8,
    "picture": b"\x89PNG\r\n\x1a\n" + bytes(range(256)) * 8,
    "program": b"\x7fELF" + bytes(range(256)) * 8,
    "riff only": b"RIFF",
    "riff of nothing": b"RIFF\x04\0\0\0WAVE",
    "riff twice": b"RIFF\x04\0\0\0WAVE" * 300,
    "flac mark": b"fLaC" + b"\0" * 400,
    "form": b"FORM\0\0\0\x04AIFF" + b"\0" * 40,
    "ogg mark": b"OggS" + b"\xff" * 400,
}
CONTENTS: dict[str, Callable[[], np.ndarray]] = {
    "silent": lambda: np.zeros(8000),
    "constant": lambda: np.full(8000, 0.7),
    "one sample": lambda: np.array([0.5]),
    "two samples": lambda: np.array([0.5, -0.5]),
    "nan": lambda: np.where(np.arange(8000) == 4000, np.nan, taps(2.0)[:, 0]),
    "all nan": lambda: np.full(8000, np.nan),
    "inf": lambda: np.where(np.arange(8000) == 7999, np.inf, taps(2.0)[:, 0]),
    "huge": lambda: taps(2.0) * 1e37,
    "tiny": lambda: taps(2.0) * 1e-37,
    "square": lambda: np.sign(np.sin(np.arange(16000) / 9.0)),
    "all blows": lambda: np.where(np.arange(16000) % 40 == 0, 0.9, 0.0),
    "step": lambda: (np.arange(16000) > 8000) * 0.9,
    "noise": lambda: np.random.default_rng(2).uniform(-1, 1, 24000),
    "clipped": lambda: np.clip(30 * taps(), -1, 1),
    "offset": lambda: 0.9 + 0.01 * taps(),
}


def wav(seconds: float = 6.0, rate_hz: int = 4000) -> bytes:
    """A plain 16 bit file with a header of 44 bytes."""
    data = (taps(seconds, rate_hz)[:, 0] * 32767).astype("<i2").tobytes()
    head = struct.pack(
        "<4sI4s4sIHHIIHH",
        b"RIFF",
        36 + len(data),
        b"WAVE",
        b"fmt ",
        16,
        1,
        1,
        rate_hz,
        2 * rate_hz,
        2,
        16,
    )
    return head + struct.pack("<4sI", b"data", len(data)) + data


def _bytes(content: bytes, ending: str, folder: Path) -> Path:
    path = folder / f"tap.{ending}"
    path.write_bytes(content)
    return path


def _patched(place: int, form: str, value: int, folder: Path) -> Path:
    content = bytearray(wav())
    struct.pack_into(form, content, place, value)
    return _bytes(bytes(content), "wav", folder)


def _coded(ending: str, coding: str, folder: Path) -> Path:
    path = folder / f"tap.{ending}"
    soundfile.write(path, taps(), 8000 if ending == "ogg" else 4000, subtype=coding)
    return path


def _cut(ending: str, coding: str, share: float, folder: Path) -> Path:
    path = _coded(ending, coding, folder)
    content = path.read_bytes()
    path.write_bytes(content[: int(share * len(content))])
    return path


def _shape(rate_hz: int, columns: int, seconds: float, folder: Path) -> Path:
    path = folder / "tap.wav"
    soundfile.write(path, taps(seconds, rate_hz, columns), rate_hz, subtype="PCM_16")
    return path


def _content(kind: str, folder: Path) -> Path:
    path = folder / "tap.wav"
    soundfile.write(path, CONTENTS[kind](), 4000, subtype="FLOAT")
    return path


def _billion(sparse: bool, folder: Path) -> Path:
    """A header of 1e9 samples over little data, or over as much that takes no room on disk."""
    content = bytearray(wav())
    struct.pack_into("<I", content, 40, 2_000_000_000)
    struct.pack_into("<I", content, 4, 2_000_000_036)
    path = _bytes(bytes(content), "wav", folder)
    if sparse:
        with path.open("r+b") as file:
            file.truncate(2_000_000_044)
    return path


def cases() -> Iterator[Case]:
    """All of them."""
    whole = wav()
    for length in CUTS:
        yield Case(f"wav of {length} bytes", partial(_bytes, whole[:length], "wav"), READ)
    for name, value in SIZES.items():
        yield Case(f"wav data size {name}", partial(_patched, 40, "<I", value), READ)
        yield Case(f"wav file size {name}", partial(_patched, 4, "<I", value), READ[:1])
    for name, (place, form, values) in FIELDS.items():
        for value in values:
            yield Case(f"wav {name} {value}", partial(_patched, place, form, value), READ[:1])
    for name, content in STRANGERS.items():
        for ending in ("wav", "flac", "csv", "bin"):
            yield Case(f"{name} as {ending}", partial(_bytes, content, ending), READ[:1])
    for ending, codings in FORMATS.items():
        for coding in codings:
            yield Case(f"{ending} {coding}", partial(_coded, ending, coding), READ[:1])
            yield Case(f"{ending} {coding} cut", partial(_cut, ending, coding, 0.4), READ[:1])
    for kind in CONTENTS:
        yield Case(f"samples {kind}", partial(_content, kind), READ)
    for rate, columns, seconds in (
        (4000, 32, 3.0),
        (192_000, 1, 2.0),
        (99, 1, 60.0),
        (1, 1, 60.0),
        (1_000_000, 1, 0.2),
        (4000, 1, 0.01),
    ):
        name = f"{columns} channels at {rate} Hz, {seconds} s"
        yield Case(name, partial(_shape, rate, columns, seconds), READ)
    yield Case("1e9 samples stated", partial(_billion, False), READ)
