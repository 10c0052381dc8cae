"""Reads the samples of a SoundFont 2 bank: enough of the format to get recordings by name.

The format is RIFF: LIST chunk ``sdta`` holds all samples as 16-bit integers (``smpl``), LIST chunk
``pdta`` one header of 46 bytes for each sample (``shdr``): name, start, end, loop start, loop end,
rate, pitch as a MIDI key, correction, link, type (SoundFont Technical Specification 2.01, section
7.10).
"""

from __future__ import annotations

import struct
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

HEADER = struct.Struct("<20sIIIIIBbHH")


@dataclass(frozen=True)
class Sample:
    """One recording of a bank."""

    name: str
    rate_hz: float
    values: NDArray[np.float64]
    """(n,) of full scale 1, less the stretch at the end that the player repeats, if any."""
    key: int
    """MIDI key the recording sounds at, as the header says; 60 where nobody set it."""


def read_samples(path: Path, starts_with: str) -> dict[str, Sample]:
    """The samples whose name starts so, by name; the rest of the bank is not read."""
    with path.open("rb") as file:
        chunks = dict(_inner_chunks(file.read(12), file))
        samples_at, _ = chunks[b"smpl"]
        headers_at, size = chunks[b"shdr"]
        file.seek(headers_at)
        found = {}
        for header in HEADER.iter_unpack(file.read(size)):
            name = header[0].split(b"\0")[0].decode("ascii", "replace").strip()
            if name.startswith(starts_with):
                found[name] = _sample(file, samples_at, name, header)
    return found


def _sample(file, samples_at: int, name: str, header: tuple) -> Sample:
    _, start, end, loop_start, _, rate_hz, key, *_ = header
    repeats_at_end = loop_start > (start + end) / 2
    length = (loop_start if repeats_at_end else end) - start
    file.seek(samples_at + 2 * start)
    values = np.frombuffer(file.read(2 * length), "<i2") / 32768.0
    return Sample(name, float(rate_hz), values, key)


def _inner_chunks(riff: bytes, file) -> Iterator[tuple[bytes, tuple[int, int]]]:
    """Name, place and size of each chunk inside the lists of a bank."""
    if riff[:4] != b"RIFF" or riff[8:] != b"sfbk":
        raise ValueError("this is no SoundFont 2 bank")
    while head := file.read(8):
        kind, size = struct.unpack("<4sI", head)
        if kind == b"LIST":
            file.seek(4, 1)
            continue
        yield kind, (file.tell(), size)
        file.seek(size + size % 2, 1)
