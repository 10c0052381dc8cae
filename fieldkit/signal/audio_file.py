"""Read audio files: samples, rate, and what became of the end of a damaged file."""

from __future__ import annotations

import re
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import InputError, Place
from fieldkit.signal.mended_wav import PatchedFile, mended_wav

MAX_SAMPLES = 2**28
"""Most samples, over all channels, that are held in memory at once: 2 GiB as float64."""
SHORTEST_RESCUE_S = 0.5
"""Of a damaged file at least this much must be readable."""

_BLOCK_SAMPLES = 2**16
UNKNOWN_LENGTH_FRAMES = 2**35
"""A header with as many frames leaves the length open."""
_OPEN_ENDED_BYTES = 0x7FFFF000
"""Writers that cannot go back to the header leave a length at or above this one in it."""
_EXACT_SUBTYPES = re.compile(r"PCM_|ALAC|ULAW|ALAW|DWVW|DPCM|ADPCM")
_FLOAT_SUBTYPES = ("FLOAT", "DOUBLE")
_MENDED = "the recorder never wrote the length into the file's header; read to the end of the file"
_LYING_LENGTH = re.compile(r"^\s*(?:data|SSND|riff)\s*:\s*(\d+) \(should be (\d+)\)", re.MULTILINE)


@dataclass(frozen=True)
class AudioSamples:
    """What an audio file holds."""

    samples: NDArray[np.float64]
    """(n, channels), full scale 1."""
    rate_hz: float
    integer: bool
    """Whether the samples are stored as whole numbers, which clip at full scale."""
    notes: tuple[str, ...] = ()


def read_audio(path: Path) -> AudioSamples:
    """Read a file through libsndfile, block by block, never trusting the length in its header.

    A file that ends early is returned as far as it can be read, with a note, when that is at
    least SHORTEST_RESCUE_S. Raises InputError where it is not audio, empty, or too long.
    """
    with open_audio(path) as (audio, mended):
        samples, broke_off = _read_blocks(audio, path)
        notes = (*mended, *ending_notes(audio, len(samples), broke_off, path))
        if len(samples) == 0:
            raise empty(path)
        return AudioSamples(
            samples, float(audio.samplerate), is_integer(audio), (*notes, *coding_notes(audio))
        )


@contextmanager
def open_audio(path: Path) -> Iterator[tuple[Any, tuple[str, ...]]]:
    """An open file that holds something, and a note where its header had to be mended.

    Raises InputError where it is not audio or empty.
    """
    with _opened(path, str(path)) as audio:
        if audio.frames > 0:
            yield audio, ()
            return
    with mended_wav(path) as mended:
        if mended is None:
            raise empty(path)
        with _opened(path, mended) as audio:
            yield audio, (_MENDED,)


def is_integer(audio: Any) -> bool:
    """Whether an open file stores whole numbers, or what is as exact."""
    return bool(_EXACT_SUBTYPES.search(audio.subtype))


def _opened(path: Path, source: str | PatchedFile) -> Any:
    import soundfile

    try:
        return soundfile.SoundFile(source)
    except (soundfile.SoundFileError, TypeError, ValueError, OSError) as error:
        raise InputError(
            "cannot be read as audio: damaged from its start, or not an audio file",
            "give WAV, FLAC or AIFF, or numbers as CSV",
            Place(path),
        ) from error


def empty(path: Path) -> InputError:
    """What is said of a file without samples."""
    return InputError("the recording is empty (0 samples)", "record it again", Place(path))


def _read_blocks(audio: Any, path: Path) -> tuple[NDArray[np.float64], bool]:
    """All frames that can be decoded, and whether decoding broke off with an error."""
    import soundfile

    block = np.empty((max(1, _BLOCK_SAMPLES // audio.channels), audio.channels))
    samples = np.empty_like(block)
    count, broke_off = 0, False
    while not broke_off:
        block.fill(np.nan)
        try:
            frames = len(audio.read(out=block))
        except soundfile.SoundFileError:
            broke_off, frames = True, filled_frames(block)
        if frames == 0:
            break
        if (count + frames) * audio.channels > MAX_SAMPLES:
            raise _too_long(audio, path)
        if count + frames > len(samples):
            samples.resize((2 * len(samples), audio.channels), refcheck=False)
        samples[count : count + frames] = block[:frames]
        count += frames
    samples.resize((count, audio.channels), refcheck=False)
    return samples, broke_off


def filled_frames(block: NDArray[np.float64]) -> int:
    """Frames that arrived in a block, pre-filled with NaN, before its decoding failed."""
    missing = np.isnan(block).any(axis=1)
    return int(np.argmax(missing)) if missing.any() else len(block)


def _too_long(audio: Any, path: Path) -> InputError:
    minutes = MAX_SAMPLES / audio.channels / audio.samplerate / 60
    return InputError(
        f"the recording is too long: more than {minutes:.0f} min at {audio.samplerate} Hz "
        f"with {audio.channels} channel(s)",
        "cut it to the part that matters, or store it at a lower rate",
        Place(path),
    )


def ending_notes(audio: Any, frames: int, broke_off: bool, path: Path) -> list[str]:
    """What became of the end of a file; InputError where too little of it is left."""
    promised = _promised_frames(audio, frames)
    if promised is not None and frames >= promised:
        return []
    readable_s = frames / audio.samplerate
    if promised is not None:
        return [ended_early(readable_s, promised / audio.samplerate, path)]
    if not broke_off:
        return []
    return [_rescued("the file does not state its length", readable_s, "", path)]


def ended_early(readable_s: float, whole_s: float, path: Path) -> str:
    """What is said of a file that is shorter than it says; InputError where too little is left."""
    return _rescued("the file is damaged or ends early", readable_s, f" of {whole_s:.2f} s", path)


def _rescued(ending: str, readable_s: float, whole: str, path: Path) -> str:
    if readable_s < SHORTEST_RESCUE_S:
        raise InputError(
            f"{ending}: only {readable_s:.3f} s{whole} can be read",
            "copy it again from the recorder, or record it again",
            Place(path),
        )
    return f"{ending}: {readable_s:.2f} s{whole} could be read"


def _promised_frames(audio: Any, frames: int) -> int | None:
    """How many frames the header promises; None where it leaves that open."""
    lying = _LYING_LENGTH.findall(audio.extra_info)
    claims = [(int(claimed), int(held)) for claimed, held in lying if int(held) < int(claimed)]
    if any(claimed >= _OPEN_ENDED_BYTES for claimed, _ in claims):
        return None
    if claims:
        claimed, held = claims[-1]
        return max(frames + 1, round(frames * claimed / max(held, 1)))
    return None if audio.frames >= UNKNOWN_LENGTH_FRAMES else int(audio.frames)


def coding_notes(audio: Any) -> list[str]:
    """A caution where the audio is stored with loss."""
    if _EXACT_SUBTYPES.search(audio.subtype) or audio.subtype in _FLOAT_SUBTYPES:
        return []
    return [
        f"the audio is stored with loss ({audio.subtype}), which alters level and decay; "
        "record as WAV or FLAC"
    ]
