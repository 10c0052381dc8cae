"""Recordings too long to be held in memory: read in blocks, or by the stretch."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import AbstractContextManager, contextmanager
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Protocol, TypeVar

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.audio_file import ended_early
from fieldkit.signal.audio_stream import BrokenOff, Read, look_into
from fieldkit.signal.recording import (
    Channel,
    Recording,
    channel_signal,
    check_agrees,
    check_channel,
    check_finite,
    check_rate,
    check_readable,
    check_stated,
    is_text,
    load,
    unnamed_channels,
)

Real = NDArray[np.float64]
Answer = TypeVar("Answer")

LONG_S = 600.0
LONG_SAMPLES = 2**23
"""Over all channels: 64 MiB as float64, three minutes of one channel at 48 kHz."""


class Stored(Protocol):
    """Where samples are kept."""

    def reading(self, channel: int) -> AbstractContextManager[Read]:
        """Open it to read one channel, counted from 1."""


@dataclass(frozen=True)
class RecordingSource:
    """A recording of which only what is asked for is held in memory."""

    path: Path
    rate_hz: float
    frames: int
    channels: tuple[Channel, ...]
    full_scale: float | None
    """Sample value at which the file format clips; None where it has no rail."""
    stored: Stored
    notes: tuple[str, ...] = ()
    """What was found while opening it, such as a missing end, in words for the user."""
    begin: int = 0
    """Which of the stored frames is its first."""

    @property
    def duration_s(self) -> float:
        """Length in time."""
        return self.frames / self.rate_hz

    @property
    def long(self) -> bool:
        """Whether it is better read in blocks than loaded whole."""
        return self.duration_s > LONG_S or self.frames * len(self.channels) > LONG_SAMPLES

    @contextmanager
    def reading(self, channel: int = 1) -> Iterator[Read]:
        """Open it for several stretches of one channel; quickest in order of time.

        Reading raises InputError for a channel that is not there and for a sample that is not
        finite, BrokenOff where the file turns out to end early: see ``as_far_as_readable``.
        """
        check_channel(channel, len(self.channels), self.path)
        with self.stored.reading(channel) as read:

            def checked(first: int, past: int) -> Real:
                first, past = max(first, 0), min(past, self.frames)
                if past <= first:
                    return np.zeros(0)
                first, past = self.begin + first, self.begin + past
                samples = read(first, past)
                if self.full_scale is None:
                    check_finite(
                        samples[:, None], self.rate_hz, self.path, first=first, channel=channel
                    )
                return samples

            yield checked

    def loaded(self) -> Recording:
        """All of it, in memory, as ``load`` reads it."""
        if isinstance(self.stored, _Held):
            return self.stored.recording
        return load(self.path, rate_hz=self.rate_hz)

    def without_samples(self) -> Recording:
        """What is known of it without reading any sample."""
        nothing = np.zeros((0, len(self.channels)))
        return Recording(
            nothing, self.rate_hz, self.channels, str(self.path), self.full_scale, self.notes
        )

    def part(self, first: int, past: int) -> RecordingSource:
        """A stretch of it, to be read as a recording of its own."""
        return replace(self, begin=self.begin + first, frames=past - first)

    def stretch(self, channel: int, first: int, past: int) -> Real:
        """Samples (past - first,) of one channel, cut at the ends of the recording."""
        with self.reading(channel) as read:
            return read(first, past)

    def blocks(self, channel: int, length: int, overlap: int = 0) -> Iterator[Real]:
        """Blocks of ``length`` samples of one channel up to the end, where one may be shorter.

        Each begins ``overlap`` samples before the end of the one before; none is empty.
        """
        if not 0 <= overlap < length:
            raise ValueError(f"blocks of {length} samples that overlap by {overlap}")
        kept = np.zeros(0)
        with self.reading(channel) as read:
            for first in range(0, self.frames, length - overlap):
                fresh = read(first + len(kept), first + length)
                block = np.concatenate([kept, fresh]) if len(kept) else fresh
                yield block
                if first + length >= self.frames:
                    return
                kept = block[length - overlap :]


@dataclass(frozen=True)
class _Held:
    """Samples that are in memory after all."""

    recording: Recording

    @contextmanager
    def reading(self, channel: int) -> Iterator[Read]:
        signal = channel_signal(self.recording, channel)
        yield lambda first, past: signal[first:past]


def open_recording(path: Path, *, rate_hz: float | None = None) -> RecordingSource:
    """Open WAV, FLAC, AIFF and what else libsndfile knows without reading its samples.

    Text is read whole, as by ``load``, since only its end tells whether its times are even.
    Raises InputError as ``load`` does, but for samples that have not been looked at yet.
    """
    check_stated(rate_hz)
    check_readable(path)
    if is_text(path):
        return held(load(path, rate_hz=rate_hz))
    audio = look_into(path)
    check_agrees(rate_hz, audio.rate_hz, path)
    check_rate(audio.rate_hz, path)
    full_scale = 1.0 if audio.integer else None
    channels = unnamed_channels(audio.channels)
    return RecordingSource(
        path, audio.rate_hz, audio.frames, channels, full_scale, audio, audio.notes
    )


def held(recording: Recording) -> RecordingSource:
    """A recording in memory, to be read like one that is not."""
    return RecordingSource(
        Path(recording.source),
        recording.rate_hz,
        len(recording.samples),
        recording.channels,
        recording.full_scale,
        _Held(recording),
        recording.notes,
    )


def as_far_as_readable(
    source: RecordingSource, work: Callable[[RecordingSource], Answer]
) -> tuple[Answer, RecordingSource]:
    """What work makes of a source, and the source it was done on.

    Where decoding breaks off in the middle of a file, work is done again on what comes before.
    """
    try:
        return work(source), source
    except BrokenOff as broken:
        return as_far_as_readable(_cut(source, broken.frame), work)


def _cut(source: RecordingSource, frame: int) -> RecordingSource:
    """The source up to a frame, with a note; InputError where too little is left."""
    frames = frame - source.begin
    note = ended_early(frames / source.rate_hz, source.duration_s, source.path)
    return replace(source, frames=frames, notes=(*source.notes, note))
