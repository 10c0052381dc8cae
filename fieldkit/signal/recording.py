"""Recordings: samples with their rate, and what each channel measures."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import InputError, Place
from fieldkit.signal.audio_file import read_audio
from fieldkit.signal.text_lines import looks_like_text
from fieldkit.signal.text_numbers import LARGEST_VALUE
from fieldkit.signal.text_recording import read_text

QUANTITIES = ("acceleration", "velocity", "displacement", "pressure")
DIRECTIONS = ("vertical", "lateral", "axial", "x", "y", "z")
SI_UNIT = {"acceleration": "m/s^2", "velocity": "m/s", "displacement": "m", "pressure": "Pa"}

LOWEST_RATE_HZ = 100.0
HIGHEST_RATE_HZ = 192_000.0

_AUDIO_SUFFIXES = (".wav", ".flac", ".aif", ".aiff", ".aifc")
_TEXT_SUFFIXES = (".csv", ".txt", ".tsv")
_AUDIO_MARKS = (b"RIFF", b"RF64", b"fLaC", b"FORM", b"OggS")


@dataclass(frozen=True)
class Channel:
    """What one column of samples is."""

    name: str
    quantity: str | None = None
    """One of QUANTITIES; None where nobody said."""
    scale: float | None = None
    """SI units of the quantity per unit of sample; None where uncalibrated."""


@dataclass(frozen=True)
class Recording:
    """Samples as read from a file."""

    samples: NDArray[np.float64]
    """(n, channels), in the file's own unit: full scale 1 for audio, the column's unit for CSV."""
    rate_hz: float
    channels: tuple[Channel, ...]
    source: str
    """File name, for messages."""
    full_scale: float | None
    """Sample value at which the file format clips; None where it has no rail (CSV, float audio)."""
    notes: tuple[str, ...] = ()
    """What was done while reading, such as resampling, in words for the user."""

    @property
    def duration_s(self) -> float:
        """Length in time."""
        return len(self.samples) / self.rate_hz


def load(path: Path, *, rate_hz: float | None = None) -> Recording:
    """Read WAV, FLAC, AIFF and what else libsndfile knows, or columns of numbers as text.

    ``rate_hz`` states the sampling rate of a text file that has no time column; where a file
    tells its rate, the two must agree. Integer audio has full scale 1, and its highest positive
    sample lies one step below that. Raises InputError, with the line for a text file, where
    there is no recording in it: see ``read_audio`` and ``read_text``; and where the rate is out
    of range, a sample is not finite, or all channels are silent.
    """
    check_stated(rate_hz)
    check_readable(path)
    recording = _from_text(path, rate_hz) if is_text(path) else _from_audio(path, rate_hz)
    check_rate(recording.rate_hz, path)
    check_finite(recording.samples, recording.rate_hz, path)
    return _without_silence(recording, path)


def channel_signal(recording: Recording, channel: int) -> NDArray[np.float64]:
    """Samples (n,) of one channel; counts from 1, as printed on the box."""
    check_channel(channel, len(recording.channels), Path(recording.source))
    return np.ascontiguousarray(recording.samples[:, channel - 1])


def check_channel(channel: int, count: int, path: Path) -> None:
    """InputError where a recording of ``count`` channels has no such one."""
    if not 1 <= channel <= count:
        has = "only channel 1" if count == 1 else f"channels 1 to {count}"
        raise InputError(
            f"there is no channel {channel}: the recording has {has}",
            "name one it has",
            Place(path),
        )


def check_stated(rate_hz: float | None) -> None:
    """InputError where a stated rate is impossible."""
    if rate_hz is not None and not (math.isfinite(rate_hz) and rate_hz > 0):
        raise InputError(f"a sampling rate of {rate_hz:g} Hz", "state a rate above zero")


def check_readable(path: Path) -> None:
    """InputError where there is no file that can be opened and holds something."""
    place = Place(path)
    if path.is_dir():
        raise InputError("this is a folder, not a recording", "name a file in it", place)
    if not path.exists():
        raise InputError("there is no such file", "check its name and folder", place)
    if not path.is_file():
        raise InputError("this is not a regular file", "name a recording on disk", place)
    try:
        empty = not _head(path)
    except OSError as error:
        reason = (error.strerror or "unreadable").lower()
        raise InputError(f"the file cannot be opened: {reason}", "check it", place) from error
    if empty:
        raise InputError("the file is empty (0 bytes)", "copy or record it again", place)


def _head(path: Path) -> bytes:
    with path.open("rb") as file:
        return file.read(4096)


def is_text(path: Path) -> bool:
    """Whether a file is to be read as columns of numbers."""
    head, suffix = _head(path), path.suffix.lower()
    if suffix in _AUDIO_SUFFIXES or head.startswith(_AUDIO_MARKS):
        return False
    return suffix in _TEXT_SUFFIXES or looks_like_text(head)


def _from_audio(path: Path, rate_hz: float | None) -> Recording:
    audio = read_audio(path)
    check_agrees(rate_hz, audio.rate_hz, path)
    channels = unnamed_channels(audio.samples.shape[1])
    full_scale = 1.0 if audio.integer else None
    return Recording(
        audio.samples, audio.rate_hz, channels, str(path), full_scale, tuple(audio.notes)
    )


def check_agrees(stated_hz: float | None, rate_hz: float, path: Path) -> None:
    """InputError where a stated rate is not that of an audio file."""
    if stated_hz is not None and not math.isclose(stated_hz, rate_hz, rel_tol=1e-3):
        raise InputError(
            f"the file is sampled at {rate_hz:g} Hz, and {stated_hz:g} Hz was stated",
            "leave the stated rate out",
            Place(path),
        )


def unnamed_channels(count: int) -> tuple[Channel, ...]:
    """Channels of an audio file, which does not say what they are."""
    return tuple(Channel(f"channel {i + 1}") for i in range(count))


def _from_text(path: Path, rate_hz: float | None) -> Recording:
    text = read_text(path, None if rate_hz is None else float(rate_hz))
    channels = tuple(
        Channel(label.name or f"channel {i}", label.quantity, label.scale)
        for i, label in enumerate(text.labels, start=1)
    )
    return Recording(text.samples, text.rate_hz, channels, str(path), None, text.notes)


def check_rate(rate_hz: float, path: Path) -> None:
    """InputError where no recording can be read at this rate."""
    if not LOWEST_RATE_HZ * (1 - 1e-9) <= rate_hz <= HIGHEST_RATE_HZ * (1 + 1e-9):
        raise InputError(
            f"a sampling rate of {rate_hz:.6g} Hz is out of range: "
            f"{LOWEST_RATE_HZ:g} Hz to {HIGHEST_RATE_HZ / 1e3:g} kHz can be used",
            "check the rate, or record again",
            Place(path),
        )


def check_finite(
    samples: NDArray[np.float64], rate_hz: float, path: Path, *, first: int = 0, channel: int = 1
) -> None:
    """InputError where samples (n, channels) hold what is no measured value.

    ``first`` and ``channel`` are the frame and the channel in the file at which they begin.
    """
    if samples.min() >= -LARGEST_VALUE and samples.max() <= LARGEST_VALUE:
        return
    row, column = np.argwhere(~(np.abs(samples) <= LARGEST_VALUE))[0]
    frame = first + int(row)
    raise InputError(
        f"channel {channel + column} is {samples[row, column]:g}, not a measured value, at "
        f"{frame / rate_hz:.6f} s (sample {frame + 1})",
        "export or record it again",
        Place(path),
    )


def _without_silence(recording: Recording, path: Path) -> Recording:
    """The recording with a note on its silent channels; InputError where all are silent."""
    silent = np.ptp(recording.samples, axis=0) == 0.0
    if len(recording.samples) < 2:
        raise InputError("the recording holds a single sample", "record it again", Place(path))
    if silent.all():
        raise InputError(
            "the recording is silent: all samples are equal",
            "check cable, sensor supply and input level, then record again",
            Place(path),
        )
    notes = tuple(f"channel {i + 1} is silent" for i in np.flatnonzero(silent))
    return replace(recording, notes=(*recording.notes, *notes))
