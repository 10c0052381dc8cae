"""Recordings read by the stretch and in blocks hold what loading them whole gives."""

from __future__ import annotations

import struct
from pathlib import Path

import numpy as np
import pytest
import soundfile
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.errors import InputError
from fieldkit.signal.recording import Channel, Recording, channel_signal, load
from fieldkit.signal.source import (
    LONG_SAMPLES,
    RecordingSource,
    as_far_as_readable,
    held,
    open_recording,
)

RATE_HZ = 4000


def noise(seconds: float = 3.0, channels: int = 2, seed: int = 5) -> np.ndarray:
    rng = np.random.default_rng(seed)
    return 0.2 * rng.uniform(-1, 1, (int(seconds * RATE_HZ), channels))


def audio(path: Path, samples: np.ndarray, subtype: str = "PCM_16") -> Path:
    soundfile.write(path, samples, RATE_HZ, subtype=subtype)
    return path


def cut_off(path: Path, share: float) -> Path:
    path.write_bytes(path.read_bytes()[: int(share * path.stat().st_size)])
    return path


def in_memory(count: int) -> RecordingSource:
    samples = np.arange(1.0, count + 1)[:, None]
    return held(Recording(samples, 1000.0, (Channel("a"),), "made.wav", None))


def whole(source: RecordingSource, channel: int = 1) -> np.ndarray:
    return np.concatenate(list(source.blocks(channel, 1000)))


@pytest.mark.parametrize(
    ("name", "subtype"),
    [
        ("a.wav", "PCM_16"),
        ("a.wav", "PCM_24"),
        ("a.wav", "FLOAT"),
        ("a.flac", "PCM_16"),
        ("a.flac", "PCM_24"),
        ("a.aiff", "PCM_24"),
    ],
)
def test_any_stretch_of_any_channel_is_that_of_the_loaded_recording(tmp_path, name, subtype):
    path = audio(tmp_path / name, noise(), subtype)
    recording, source = load(path), open_recording(path)
    assert source.frames == len(recording.samples)
    assert (source.rate_hz, source.full_scale) == (recording.rate_hz, recording.full_scale)
    assert source.channels == recording.channels
    with source.reading(2) as read:
        for first, past in ((5000, 9000), (100, 101), (0, 12000), (-5, 3), (11990, 20000)):
            expected = recording.samples[max(first, 0) : past, 1]
            np.testing.assert_array_equal(read(first, past), expected)
        assert len(read(12000, 13000)) == len(read(7, 7)) == 0


def test_each_of_eight_channels_is_read_alone(tmp_path):
    written = noise(1.0, 8) + 0.05 * np.arange(8)
    source = open_recording(audio(tmp_path / "a.wav", written, "DOUBLE"))
    for channel in range(8):
        np.testing.assert_array_equal(whole(source, channel + 1), written[:, channel])


@given(st.integers(1, 400), st.integers(1, 120), st.floats(0, 0.99))
@settings(max_examples=60)
def test_blocks_tile_the_recording_whatever_their_length_and_overlap(count, length, share):
    """Each begins a hop after the one before, all but the last are full, and none is empty."""
    overlap = int(share * length)
    blocks = list(in_memory(count).blocks(1, length, overlap))
    hop = length - overlap
    for i, block in enumerate(blocks):
        np.testing.assert_array_equal(block, np.arange(i * hop, min(i * hop + length, count)) + 1.0)
        assert len(block) > 0
    assert blocks[-1][-1] == count
    assert len(blocks) == max(0, -(-(count - length) // hop)) + 1
    assert all(len(block) == length for block in blocks[:-1])


@pytest.mark.parametrize(("length", "overlap"), [(0, 0), (10, 10), (10, -1)])
def test_blocks_that_never_advance_are_no_blocks(length, overlap):
    with pytest.raises(ValueError, match="blocks of"):
        next(in_memory(100).blocks(1, length, overlap))


@pytest.mark.parametrize(("name", "subtype"), [("a.wav", "PCM_16"), ("a.flac", "PCM_24")])
def test_file_cut_off_in_the_middle_is_read_as_far_as_it_goes(tmp_path, name, subtype):
    """A recorder that lost its power: the same samples and the same note as when loaded."""
    path = cut_off(audio(tmp_path / name, noise(20.0, 1), subtype), 0.6)
    recording, source = load(path), open_recording(path)
    np.testing.assert_array_equal(whole(source), channel_signal(recording, 1))
    assert source.notes == recording.notes
    assert "of 20.00 s could be read" in source.notes[0]


def test_file_that_is_damaged_in_its_middle_is_used_up_to_there(tmp_path):
    path = audio(tmp_path / "a.flac", noise(20.0, 1))
    data = bytearray(path.read_bytes())
    middle = len(data) // 2
    data[middle : middle + 3000] = np.random.default_rng(1).bytes(3000)
    path.write_bytes(data)
    samples, source = as_far_as_readable(open_recording(path), whole)
    assert 0.4 * 20 < source.duration_s < 0.6 * 20
    assert len(samples) == source.frames
    np.testing.assert_allclose(samples[:-4096], noise(20.0, 1)[: len(samples) - 4096, 0], atol=1e-4)
    assert source.notes == (
        f"the file is damaged or ends early: {source.duration_s:.2f} s of 20.00 s could be read",
    )


def test_too_little_before_the_damage_is_refused(tmp_path):
    path = cut_off(audio(tmp_path / "a.wav", noise(2.0)), 0.1)
    with pytest.raises(InputError, match=r"only 0.198 s of 2.00 s can be read"):
        open_recording(path)


def test_header_that_was_never_finished_loses_nothing(tmp_path):
    path = audio(tmp_path / "a.wav", noise())
    data = bytearray(path.read_bytes())
    at = data.find(b"data") + 4
    data[at : at + 4] = struct.pack("<I", 0)
    path.write_bytes(data)
    source = open_recording(path)
    np.testing.assert_allclose(whole(source, 2), noise()[:, 1], atol=2**-15)
    assert "never wrote the length" in source.notes[0]


def test_length_in_the_header_is_not_believed(tmp_path):
    path = audio(tmp_path / "a.flac", noise(20.0))
    data = bytearray(path.read_bytes())
    data[21] |= 0x0F
    data[22:26] = b"\xff" * 4
    path.write_bytes(data)
    assert open_recording(path).frames == 20 * RATE_HZ


def test_sample_that_is_no_measurement_is_placed_in_the_whole_recording(tmp_path):
    samples = noise()
    samples[9000, 1] = np.nan
    source = open_recording(audio(tmp_path / "a.wav", samples, "FLOAT"))
    with pytest.raises(InputError, match=r"channel 2 is nan.*2\.250000 s \(sample 9001\)"):
        whole(source, 2)
    assert len(whole(source, 1)) == len(samples)


@pytest.mark.parametrize("channel", [0, 3])
def test_channel_that_is_not_there_is_refused(tmp_path, channel):
    source = open_recording(audio(tmp_path / "a.wav", noise()))
    with pytest.raises(InputError, match="the recording has channels 1 to 2"):
        source.stretch(channel, 0, 10)


def test_bad_files_and_rates_are_refused_as_when_loaded(tmp_path):
    path = audio(tmp_path / "a.wav", noise())
    with pytest.raises(InputError, match="no such file"):
        open_recording(tmp_path / "none.wav")
    with pytest.raises(InputError, match="4100 Hz was stated"):
        open_recording(path, rate_hz=4100)
    with pytest.raises(InputError, match="empty"):
        open_recording(audio(tmp_path / "b.wav", noise(0.0)))


def test_text_is_read_like_audio(tmp_path):
    path = tmp_path / "a.csv"
    path.write_text("t,x\n" + "".join(f"{i / 1000},{i % 7}\n" for i in range(500)))
    source = open_recording(path)
    np.testing.assert_array_equal(source.stretch(1, 3, 6), [3.0, 4.0, 5.0])
    assert source.rate_hz == 1000.0
    assert not source.long


def test_long_is_a_matter_of_time_or_of_memory():
    long = np.broadcast_to(np.zeros(1), (LONG_SAMPLES + 1, 1))
    channels = (Channel("a"),)
    assert held(Recording(long, 192e3, channels, "a.wav", None)).long
    assert held(Recording(long[:601_000], 1e3, channels, "a.wav", None)).long
    assert not held(Recording(long[:599_000], 1e3, channels, "a.wav", None)).long
