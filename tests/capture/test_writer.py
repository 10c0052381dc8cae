"""Files of a recording: whole at every moment, in parts where long, kept when the disk is full."""

from __future__ import annotations

import os
import resource
import shutil
import signal
import subprocess
import threading

import numpy as np
import pytest
import soundfile

from fieldkit.capture.session import Session
from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.sidecar import RecordingInfo, gaps_of, read_info, sidecar_path
from fieldkit.capture.source import Block
from fieldkit.capture.wav_file import WavFile, pcm_24
from fieldkit.capture.writer import RecordingWriter
from fieldkit.errors import InputError
from fieldkit.signal.recording import load
from tests.capture.made_source import RATE_HZ, MadeSource, block, waits_for
from tests.capture.rig import until

INFO = RecordingInfo("made up", RATE_HZ, (ChannelSetup(),), "2026-01-01T00:00:00+00:00", True)


def test_a_wav_is_readable_after_every_append(tmp_path):
    path = tmp_path / "x.wav"
    file = WavFile(path, rate_hz=RATE_HZ, channels=2)
    samples = np.random.default_rng(0).uniform(-1, 1, (1001, 2))
    for end in (1, 500, 1001):
        file.append(samples[soundfile.info(path).frames : end])
        read, rate_hz = soundfile.read(path)
        assert rate_hz == RATE_HZ
        np.testing.assert_allclose(read, samples[:end], atol=2**-24)
    file.close()
    assert soundfile.info(path).frames == 1001
    assert path.stat().st_size % 2 == 0


def test_24_bits_hold_16_and_24_bit_samples_exactly_and_clip_at_the_rail():
    steps = np.array([-(2**23), -1, 0, 1, 12345, 2**23 - 1])
    assert pcm_24(steps / 2**23) == b"".join(
        int(step).to_bytes(3, "little", signed=True) for step in steps
    )
    assert pcm_24(np.array([1.5, -1.5])) == b"\xff\xff\x7f\x00\x00\x80"


def test_our_loader_and_libsndfile_read_the_same(tmp_path):
    writer = RecordingWriter(tmp_path / "x.wav", INFO)
    writer.feed(block(3000))
    writer.close("done")
    loaded = load(tmp_path / "x.wav")
    read, _ = soundfile.read(tmp_path / "x.wav", always_2d=True)
    np.testing.assert_array_equal(loaded.samples, read)
    assert loaded.full_scale == 1.0
    assert loaded.notes == ()


def test_nothing_is_ever_overwritten(tmp_path):
    path = tmp_path / "x.wav"
    path.write_bytes(b"mine")
    with pytest.raises(InputError, match="there already"):
        RecordingWriter(path, INFO)
    assert path.read_bytes() == b"mine"
    sidecar_path(tmp_path / "y.wav").write_text("mine")
    with pytest.raises(InputError, match="there already"):
        RecordingWriter(tmp_path / "y.wav", INFO)
    assert not (tmp_path / "y.wav").exists()


@pytest.mark.parametrize(("name", "says"), [("x.flac", "WAV"), ("none/x.wav", "no such file")])
def test_what_cannot_be_written_is_told_before_anything_is_recorded(tmp_path, name, says):
    with pytest.raises(InputError, match=says):
        RecordingWriter(tmp_path / name, INFO)


def test_a_long_recording_goes_on_in_parts_with_its_gaps(tmp_path):
    writer = RecordingWriter(tmp_path / "x.wav", INFO, part_frames=1000)
    writer.feed(block(600))
    writer.feed(block(600, first_frame=600))
    writer.feed(block(600, first_frame=1200, lost_frames=5, cause="x"))
    writer.feed(block(600, first_frame=1800))
    writer.feed(block(100, first_frame=2400, lost_frames=6, cause="y"))
    writer.close("done")
    names = ["x.wav", "x-part2.wav", "x-part3.wav"]
    assert [path.name for path in writer.paths] == names
    parts = [soundfile.read(tmp_path / name)[0] for name in names]
    assert [len(part) for part in parts] == [1000, 1000, 500]
    np.testing.assert_allclose(np.concatenate(parts), np.arange(2500) % 1000 / 1000, atol=1e-6)
    marked = [[(gap.frame, gap.lost_frames) for gap in gaps_of(tmp_path / n)] for n in names]
    assert marked == [[], [(200, 5)], [(400, 6)]]
    assert read_info(tmp_path / "x.wav").ended == "goes on in x-part2.wav"
    assert read_info(tmp_path / "x-part2.wav").continues == "x.wav"
    assert read_info(tmp_path / "x-part3.wav").ended == "done"


def test_a_gap_between_two_parts_is_marked_in_the_second(tmp_path):
    writer = RecordingWriter(tmp_path / "x.wav", INFO, part_frames=100)
    writer.feed(block(100))
    writer.feed(block(50, lost_frames=5, cause="x"))
    writer.close("done")
    assert [gap.frame for gap in gaps_of(tmp_path / "x-part2.wav")] == [0]


def test_a_disk_that_cannot_follow_costs_frames_and_they_are_marked(tmp_path, monkeypatch):
    going_on = threading.Event()
    append = WavFile.append

    def slow(self, samples):
        going_on.wait(60.0)
        append(self, samples)

    monkeypatch.setattr(WavFile, "append", slow)
    writer = RecordingWriter(tmp_path / "x.wav", INFO, waiting_s=0.1)
    for number in range(10):
        writer.feed(block(400, first_frame=400 * number))
    going_on.set()
    until(lambda: writer.frames_written >= 800)
    writer.feed(block(100, first_frame=4000))
    writer.close("done")
    (gap,) = gaps_of(tmp_path / "x.wav")
    assert gap.cause == "the disk was too slow"
    assert gap.frame + gap.lost_frames + 100 == 4100
    assert soundfile.info(tmp_path / "x.wav").frames + gap.lost_frames == 4100


def fill(path, frames):
    """Record more than there is room for."""
    begun = threading.Event()

    def steps():
        samples = np.random.default_rng(0).uniform(-1, 1, (400, 1)).astype(np.float32)
        yield begun.wait
        for number in range(frames // 400):
            yield Block(400 * number, samples)
            yield waits_for(lambda sent=400 * number: session.snapshot().frames >= sent)

    session = Session(MadeSource(steps()))
    session.start()
    session.record(path, (ChannelSetup(),))
    begun.set()
    assert session.join(60.0)
    return session.snapshot()


def assert_kept(shot, path, at_least):
    assert shot.message.startswith("the disk is full: the recording ended after ")
    assert shot.message.endswith(f"all of it is in {path.name}")
    assert shot.recording.failure == shot.message
    assert shot.frames == 100_000
    kept = soundfile.info(path).frames
    assert kept == round(shot.recording.seconds * RATE_HZ)
    assert kept > at_least
    np.testing.assert_allclose(
        soundfile.read(path)[0][:400], np.random.default_rng(0).uniform(-1, 1, 400), atol=1e-6
    )
    assert load(path).duration_s * RATE_HZ == kept
    assert read_info(path) is not None


def test_a_full_disk_ends_the_recording_and_keeps_what_came_before(tmp_path):
    disk = tmp_path / "small"
    disk.mkdir()
    mounted = shutil.which("mount") and subprocess.run(
        ["mount", "-t", "tmpfs", "-o", "size=128k", "tmpfs", str(disk)],
        capture_output=True,
        check=False,
    )
    if not mounted or mounted.returncode:
        pytest.skip("a small disk can only be mounted by root")
    try:
        shot = fill(disk / "x.wav", 100_000)
        assert_kept(shot, disk / "x.wav", 30_000)
        assert not list(disk.glob(".*"))
    finally:
        subprocess.run(["umount", str(disk)], check=True)


@pytest.mark.skipif(not hasattr(signal, "SIGXFSZ"), reason="this system limits no file sizes")
def test_a_file_that_may_not_grow_ends_the_recording_in_the_same_way(tmp_path):
    before = resource.getrlimit(resource.RLIMIT_FSIZE)
    resource.setrlimit(resource.RLIMIT_FSIZE, (100_000, before[1]))
    try:
        shot = fill(tmp_path / "x.wav", 100_000)
    finally:
        resource.setrlimit(resource.RLIMIT_FSIZE, before)
    assert_kept(shot, tmp_path / "x.wav", 30_000)
    assert "the disk is full" in read_info(tmp_path / "x.wav").ended


def test_a_folder_that_may_not_be_written_is_told(tmp_path):
    if os.geteuid() == 0:
        target = "/proc/x.wav"
    else:
        tmp_path.chmod(0o500)
        target = tmp_path / "x.wav"
    from pathlib import Path

    with pytest.raises(InputError, match="cannot be written"):
        RecordingWriter(Path(target), INFO)
