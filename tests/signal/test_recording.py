"""Recordings from audio files, and what is said about bad ones."""

from __future__ import annotations

import contextlib
import os
import struct
from pathlib import Path

import numpy as np
import pytest
import soundfile

from fieldkit.errors import InputError
from fieldkit.signal import audio_file
from fieldkit.signal.recording import channel_signal, load

RATE_HZ = 4000


def noise(seconds: float = 2.0, channels: int = 2) -> np.ndarray:
    rng = np.random.default_rng(7)
    return 0.2 * rng.uniform(-1, 1, (int(seconds * RATE_HZ), channels))


def audio(path: Path, samples: np.ndarray, subtype: str = "PCM_16", rate: int = RATE_HZ) -> Path:
    form = "AIFF" if path.suffix == ".aif" else None
    soundfile.write(path, samples, rate, subtype=subtype, format=form)
    return path


def refusal(path: Path, **options: float) -> str:
    with pytest.raises(InputError) as caught:
        load(path, **options)
    sentence = str(caught.value)
    assert str(path) in sentence
    assert "\n" not in sentence
    return sentence


@pytest.mark.parametrize(
    ("name", "subtype", "step", "full_scale"),
    [
        ("a.wav", "PCM_16", 2**-15, 1.0),
        ("a.wav", "PCM_24", 2**-23, 1.0),
        ("a.wav", "PCM_U8", 2**-7, 1.0),
        ("a.wav", "FLOAT", 1e-7, None),
        ("a.flac", "PCM_16", 2**-15, 1.0),
        ("a.flac", "PCM_24", 2**-23, 1.0),
        ("a.aiff", "PCM_16", 2**-15, 1.0),
        ("a.aif", "FLOAT", 1e-7, None),
    ],
)
def test_audio_comes_back_as_written(tmp_path, name, subtype, step, full_scale):
    written = noise()
    recording = load(audio(tmp_path / name, written, subtype))
    np.testing.assert_allclose(recording.samples, written, atol=1.01 * step)
    assert recording.rate_hz == RATE_HZ
    assert recording.full_scale == full_scale
    assert recording.duration_s == 2.0
    assert [channel.name for channel in recording.channels] == ["channel 1", "channel 2"]
    assert all(c.quantity is None and c.scale is None for c in recording.channels)
    assert recording.notes == ()
    assert recording.source == str(tmp_path / name)


@pytest.mark.parametrize("channels", [1, 3, 8])
def test_any_number_of_channels_in_their_order(tmp_path, channels):
    written = noise(0.5, channels) + 0.1 * np.arange(channels)
    recording = load(audio(tmp_path / "a.wav", written, "DOUBLE"))
    for channel in range(channels):
        np.testing.assert_array_equal(channel_signal(recording, channel + 1), written[:, channel])


@pytest.mark.parametrize("rate", [100, 2048, 192_000])
def test_rates_in_range_are_read(tmp_path, rate):
    assert load(audio(tmp_path / "a.wav", noise(), rate=rate)).rate_hz == rate


@pytest.mark.parametrize("rate", [99, 192_001, 384_000])
def test_rates_out_of_range_are_refused(tmp_path, rate):
    assert "out of range: 100 Hz to 192 kHz" in refusal(
        audio(tmp_path / "a.wav", noise(), rate=rate)
    )


def test_more_than_a_block_is_read_whole(tmp_path):
    written = noise(60.0, 1)
    recording = load(audio(tmp_path / "a.flac", written, "PCM_24"))
    np.testing.assert_allclose(recording.samples, written, atol=2**-23)


def test_lossy_audio_is_read_with_a_caution(tmp_path):
    recording = load(audio(tmp_path / "a.ogg", noise(), "VORBIS"))
    assert recording.full_scale is None
    assert "stored with loss (VORBIS)" in recording.notes[0]


def test_audio_is_known_by_its_content_where_the_name_says_nothing(tmp_path):
    audio(tmp_path / "a.flac", noise()).rename(tmp_path / "take-1.dat")
    assert load(tmp_path / "take-1.dat").samples.shape == (2 * RATE_HZ, 2)


def test_stated_rate_must_agree_with_the_file(tmp_path):
    path = audio(tmp_path / "a.wav", noise())
    assert load(path, rate_hz=RATE_HZ).rate_hz == RATE_HZ
    assert "sampled at 4000 Hz, and 4100 Hz was stated" in refusal(path, rate_hz=4100)


@pytest.mark.parametrize("rate_hz", [0.0, -5.0, float("nan"), float("inf")])
def test_impossible_stated_rate_is_refused(tmp_path, rate_hz):
    path = audio(tmp_path / "a.wav", noise())
    with pytest.raises(InputError, match="above zero"):
        load(path, rate_hz=rate_hz)


@pytest.mark.parametrize(("name", "subtype"), [("a.wav", "PCM_16"), ("a.aiff", "PCM_24")])
def test_truncated_file_is_read_as_far_as_it_goes(tmp_path, name, subtype):
    written = noise()
    path = audio(tmp_path / name, written, subtype)
    path.write_bytes(path.read_bytes()[: int(0.6 * path.stat().st_size)])
    recording = load(path)
    readable = len(recording.samples)
    assert 0.59 * len(written) < readable < 0.6 * len(written)
    np.testing.assert_allclose(recording.samples, written[:readable], atol=2**-15)
    assert "ends early: 1.20 s of 2.00 s could be read" in recording.notes[0]


def test_truncated_flac_is_read_to_its_last_whole_frame(tmp_path):
    written = noise(20.0)
    path = audio(tmp_path / "a.flac", written)
    path.write_bytes(path.read_bytes()[: int(0.6 * path.stat().st_size)])
    recording = load(path)
    readable = len(recording.samples)
    assert 0.5 * len(written) < readable < 0.61 * len(written)
    np.testing.assert_allclose(recording.samples, written[:readable], atol=2**-15)
    assert "of 20.00 s could be read" in recording.notes[0]


def test_too_little_left_of_a_truncated_file_is_refused(tmp_path):
    path = audio(tmp_path / "a.wav", noise())
    path.write_bytes(path.read_bytes()[: int(0.1 * path.stat().st_size)])
    assert "ends early: only 0.198 s of 2.00 s can be read" in refusal(path)


def test_header_with_an_open_end_is_no_damage(tmp_path):
    """Programs that write into a pipe leave the largest length in the header."""
    path = audio(tmp_path / "a.wav", noise())
    data = bytearray(path.read_bytes())
    at = data.find(b"data") + 4
    data[at : at + 4] = struct.pack("<I", 0xFFFFFFFF)
    path.write_bytes(data)
    recording = load(path)
    assert recording.samples.shape == (2 * RATE_HZ, 2)
    assert recording.notes == ()


def test_header_that_was_never_finished_loses_nothing(tmp_path):
    """A recorder that lost its power leaves zero as the length."""
    written = noise()
    path = audio(tmp_path / "a.wav", written)
    data = bytearray(path.read_bytes())
    at = data.find(b"data") + 4
    data[at : at + 4] = bytes(4)
    path.write_bytes(data)
    recording = load(path)
    np.testing.assert_allclose(recording.samples, written, atol=2**-15)
    assert "never wrote the length" in recording.notes[0]


def test_length_in_the_header_is_not_believed(tmp_path):
    """A FLAC header that promises 2^36 - 1 frames allocates nothing by it."""
    written = noise(20.0)
    path = audio(tmp_path / "a.flac", written)
    data = bytearray(path.read_bytes())
    data[21] |= 0x0F
    data[22:26] = b"\xff" * 4
    path.write_bytes(data)
    assert len(load(path).samples) == len(written)


def test_recording_beyond_the_limit_is_refused(tmp_path, monkeypatch):
    monkeypatch.setattr(audio_file, "MAX_SAMPLES", 10_000)
    assert "too long: more than" in refusal(audio(tmp_path / "a.wav", noise()))


def test_missing_file_folder_and_device_are_told_apart(tmp_path):
    assert "no such file" in refusal(tmp_path / "none.wav")
    assert "this is a folder" in refusal(tmp_path)
    os.mkfifo(tmp_path / "pipe.wav")
    assert "not a regular file" in refusal(tmp_path / "pipe.wav")


def test_empty_files_are_refused(tmp_path):
    (tmp_path / "a.wav").write_bytes(b"")
    assert "empty (0 bytes)" in refusal(tmp_path / "a.wav")
    assert "empty (0 samples)" in refusal(audio(tmp_path / "c.wav", noise(0.0)))
    assert "single sample" in refusal(audio(tmp_path / "d.wav", noise()[:1]))


def test_stream_of_unknown_length_with_nothing_in_it_is_refused(tmp_path):
    """The 42 bytes before the first frame of a FLAC file, its count of samples left open."""
    header = bytearray(audio(tmp_path / "a.flac", noise()).read_bytes()[:42])
    header[4] |= 0x80
    header[21] &= 0xF0
    header[22:26] = bytes(4)
    (tmp_path / "a.flac").write_bytes(header)
    assert "only 0.000 s can be read" in refusal(tmp_path / "a.flac")


def test_what_is_no_audio_is_refused(tmp_path):
    (tmp_path / "a.wav").write_bytes(np.random.default_rng(1).bytes(5000))
    (tmp_path / "b.wav").write_text("t,x\n0,1\n")
    (tmp_path / "c.raw").write_bytes(bytes(1000))
    for name in ("a.wav", "b.wav", "c.raw"):
        assert "cannot be read as audio" in refusal(tmp_path / name)


def test_unreadable_file_is_refused(tmp_path, monkeypatch):
    path = audio(tmp_path / "a.wav", noise())

    def denied(*_args, **_options):
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "open", denied)
    assert "cannot be opened: permission denied" in refusal(path)


@pytest.mark.parametrize("bad", [np.nan, np.inf, -np.inf, 1e200])
def test_sample_that_is_no_measurement_is_placed_in_time(tmp_path, bad):
    samples = noise()
    samples[1000, 1] = bad
    sentence = refusal(audio(tmp_path / "a.wav", samples, "DOUBLE"))
    expected = f"channel 2 is {bad:g}, not a measured value, at 0.250000 s (sample 1001)"
    assert expected in sentence


def test_silent_recording_is_refused_and_a_silent_channel_noted(tmp_path):
    assert "is silent" in refusal(audio(tmp_path / "a.wav", np.full((4000, 2), 0.25)))
    samples = noise()
    samples[:, 0] = 0.0
    assert load(audio(tmp_path / "b.wav", samples)).notes == ("channel 1 is silent",)


@pytest.mark.parametrize("channel", [0, 3, -1])
def test_channel_that_is_not_there_is_refused_with_those_that_are(tmp_path, channel):
    recording = load(audio(tmp_path / "a.wav", noise()))
    with pytest.raises(InputError, match="the recording has channels 1 to 2"):
        channel_signal(recording, channel)


@pytest.mark.parametrize("seed", range(40))
def test_damaged_bytes_never_end_in_anything_but_a_recording_or_a_sentence(tmp_path, seed):
    """Header and data bytes overwritten at random, in every format in turn."""
    rng = np.random.default_rng(seed)
    name, subtype = [("a.wav", "PCM_16"), ("a.flac", "PCM_16"), ("a.aiff", "FLOAT")][seed % 3]
    path = audio(tmp_path / name, noise(0.6), subtype)
    data = bytearray(path.read_bytes())
    for at in rng.integers(0, 80 if seed % 2 else len(data), 6):
        data[at] = rng.integers(256)
    path.write_bytes(data)
    with contextlib.suppress(InputError):
        assert np.isfinite(load(path).samples).all()
