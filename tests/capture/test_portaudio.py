"""Capture through real PortAudio: every bit, and every way an input can fail."""

from __future__ import annotations

import time

import numpy as np
import pytest
import soundfile

from fieldkit.capture.devices import find_input, list_inputs
from fieldkit.capture.portaudio import PortAudioSource
from fieldkit.capture.session import Session
from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.sidecar import gaps_of, read_info
from fieldkit.capture.snapshot import RUNNING, WAITING
from fieldkit.errors import InputError, Refusal
from tests.capture.rig import RATE_HZ, until

MARK = 12345
AT_ONCE_S = 20.0
"""PortAudio waits half a minute for a frozen server."""
TWO = (ChannelSetup(), ChannelSetup())


def open_bench(**options):
    device = find_input("bench", list_inputs(check_rates=False))
    return Session(PortAudioSource(device, rate_hz=RATE_HZ, channels=2, **options))


@pytest.fixture
def session(bench):
    made = open_bench()
    made.start()
    try:
        until(lambda: made.snapshot().frames > 0, why="the first block")
        yield made
    finally:
        made.stop()
        assert made.join(60.0)


def noise(seconds, seed=0):
    samples = np.random.default_rng(seed).integers(-32768, 32767, (round(seconds * RATE_HZ), 2))
    samples[0] = MARK
    return samples.astype(np.int16)


def as_recorded(path):
    """Samples of a recording as the int16 that were played."""
    samples, rate_hz = soundfile.read(path, dtype="int32", always_2d=True)
    assert rate_hz == RATE_HZ
    assert not np.any(samples & 0xFFFF)
    return samples >> 16


def found_in(recorded, played):
    """Where what was played begins in a recording."""
    starts = np.flatnonzero((recorded == MARK).all(axis=1))
    matching = [i for i in starts if np.array_equal(recorded[i : i + 9], played[:9])]
    return matching[0] if matching else None


def test_inputs_are_listed_with_channels_and_rates(bench):
    inputs = list_inputs()
    assert {"bench", "default"} <= {device.name for device in inputs}
    device = find_input("bench", inputs)
    assert device.host_api == "ALSA"
    assert device.channels >= 2
    assert {44100, 48000} <= set(device.rates_hz)
    assert find_input(str(device.index), inputs) is device
    assert find_input(None, inputs).default
    with pytest.raises(InputError, match=r"no input called 'bunch'.*bench"):
        find_input("bunch", inputs)


def test_a_rate_that_cannot_be_is_told(bench):
    device = find_input("bench", list_inputs(check_rates=False))
    with pytest.raises(Refusal, match="cannot be opened at 5 Hz"):
        PortAudioSource(device, rate_hz=5).start(lambda _: None, lambda _: None)
    with pytest.raises(InputError, match="channel"):
        PortAudioSource(device, channels=device.channels + 1)


def test_what_is_played_is_recorded_to_the_last_bit(session, bench, tmp_path):
    played = noise(3.0)
    session.record(tmp_path / "x.wav", TWO)
    until(lambda: session.snapshot().recording)
    heard = session.snapshot().frames
    bench.play(played)
    until(lambda: bench.players[0].poll() is not None, why="the player ends")
    until(lambda: session.snapshot().frames > heard + len(played) + 2 * RATE_HZ)
    session.end_recording()
    until(lambda: session.snapshot().recording.done)
    recorded = as_recorded(tmp_path / "x.wav")
    start = found_in(recorded, played)
    np.testing.assert_array_equal(recorded[start : start + len(played)], played)
    assert session.snapshot().lost_frames == 0
    assert gaps_of(tmp_path / "x.wav") == ()
    info = read_info(tmp_path / "x.wav")
    assert (info.device, info.rate_hz, info.simulated) == ("bench", RATE_HZ, False)
    assert session.snapshot().levels[0].clipped_samples > 0


def goes_on(session, path, cause):
    """The session runs again, and what was missed is marked."""
    until(lambda: session.snapshot().state == RUNNING, why="the session runs again")
    frames = session.snapshot().frames
    until(lambda: session.snapshot().frames > frames + RATE_HZ, why="frames arrive again")
    gaps = gaps_of(path)
    assert cause in gaps[0].cause
    assert gaps[0].lost_frames > 0
    assert not gaps[0].exact
    return gaps


def test_a_device_torn_out_is_told_and_recorded_again_when_it_is_back(session, bench, tmp_path):
    session.record(tmp_path / "x.wav", TWO)
    until(lambda: session.snapshot().frames > RATE_HZ)
    bench.kill()
    until(lambda: session.snapshot().state == WAITING)
    assert session.snapshot().message.startswith("bench is gone: what was recorded is safe")
    until(lambda: soundfile.info(tmp_path / "x.wav").frames > RATE_HZ / 2)
    bench.begin()
    goes_on(session, tmp_path / "x.wav", "bench is gone")


def test_an_input_that_delivers_nothing_is_told_and_waited_for(session, bench, tmp_path):
    session.record(tmp_path / "x.wav", TWO)
    until(lambda: session.snapshot().frames > RATE_HZ)
    bench.stall(True)
    until(lambda: session.snapshot().state == WAITING)
    assert session.snapshot().message.startswith("bench delivers nothing")
    bench.stall(False)
    goes_on(session, tmp_path / "x.wav", "bench delivers nothing")


def test_a_frozen_server_is_told_and_keeps_nobody_waiting(session, bench, tmp_path):
    session.record(tmp_path / "x.wav", TWO)
    until(lambda: session.snapshot().frames > RATE_HZ)
    bench.freeze()
    until(lambda: session.snapshot().state == WAITING)
    assert session.snapshot().message.startswith("the audio server behind bench does not answer")
    bench.thaw()
    goes_on(session, tmp_path / "x.wav", "does not answer")


def test_a_session_on_a_frozen_server_ends_at_once(bench, tmp_path):
    session = open_bench()
    session.start()
    until(lambda: session.snapshot().frames > 0)
    session.record(tmp_path / "x.wav", TWO)
    until(lambda: session.snapshot().recording)
    bench.freeze()
    session.stop()
    assert session.join(AT_ONCE_S)
    assert session.snapshot().recording.done
    bench.thaw()


def test_frames_that_go_missing_without_a_word_are_found_by_the_clock(bench, tmp_path):
    session = open_bench(stalled_after_s=60.0)
    session.start()
    until(lambda: session.snapshot().frames > 0)
    session.record(tmp_path / "x.wav", TWO)
    until(lambda: session.snapshot().frames > 4 * RATE_HZ)
    bench.stall(True)
    end = time.monotonic() + 0.5
    until(lambda: time.monotonic() > end)
    heard = session.snapshot().frames
    bench.stall(False)
    until(lambda: session.snapshot().gaps, why="the loss is found")
    (gap,) = until(lambda: gaps_of(tmp_path / "x.wav"))
    session.stop()
    assert session.join(60.0)
    assert "went missing" in gap.cause
    low, high = gap.range
    assert low - RATE_HZ <= heard <= high + RATE_HZ
    assert gap.lost_frames > 0.3 * RATE_HZ


def test_a_source_that_was_stopped_delivers_nothing_more(bench):
    device = find_input("bench", list_inputs(check_rates=False))
    source = PortAudioSource(device, rate_hz=RATE_HZ, channels=1)
    blocks, ends = [], []
    source.start(blocks.append, ends.append)
    until(lambda: blocks)
    source.stop()
    count = len(blocks)
    until(lambda: not device_is_open())
    assert len(blocks) == count
    assert not ends


def device_is_open():
    from fieldkit.capture.library import _open_streams

    return bool(_open_streams)
