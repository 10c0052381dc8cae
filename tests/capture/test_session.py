"""A session as its user sees it: what is recorded, what listeners get, what is said."""

from __future__ import annotations

import threading
import tracemalloc
from itertools import chain

import numpy as np
import pytest
import soundfile

from fieldkit.capture.session import Session
from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.sidecar import gaps_of, read_info
from fieldkit.capture.snapshot import ENDED, PAUSED, RUNNING, WAITING
from fieldkit.capture.source import Block, SourceEnd
from fieldkit.errors import InputError, Refusal
from tests.capture.made_source import RATE_HZ, MadeSource, block, waits_for
from tests.capture.rig import until

ONE = (ChannelSetup(),)


class Gathering:
    """A listener that keeps what it gets."""

    def __init__(self):
        self.blocks = []

    def feed(self, block):
        self.blocks.append(block)


def finished(session):
    """Run a session to its end."""
    assert session.join(60.0)
    return session.snapshot()


def recorded(path):
    samples, _ = soundfile.read(path, dtype="float32", always_2d=True)
    return samples


def test_every_frame_is_recorded_and_heard(tmp_path):
    parts = [block(100, first_frame=100 * i) for i in range(50)]
    gate = threading.Event()
    session = Session(MadeSource(chain([gate.wait], parts)))
    listener = Gathering()
    session.start()
    session.add(listener)
    session.record(tmp_path / "x.wav", ONE)
    gate.set()
    shot = finished(session)
    whole = np.concatenate([part.samples for part in parts])
    np.testing.assert_allclose(recorded(tmp_path / "x.wav"), whole, atol=2**-24)
    np.testing.assert_array_equal(np.concatenate([b.samples for b in listener.blocks]), whole)
    assert [b.first_frame for b in listener.blocks] == [100 * i for i in range(50)]
    assert (shot.state, shot.frames, shot.lost_frames, shot.failed) == (ENDED, 5000, 0, False)
    assert shot.recording.done
    assert shot.recording.seconds == 5000 / RATE_HZ
    info = read_info(tmp_path / "x.wav")
    assert info.simulated
    assert info.ended == "all was delivered"


def test_a_recording_of_a_stated_length_has_it_to_the_frame(tmp_path):
    gate = threading.Event()
    session = Session(MadeSource(chain([gate.wait], (block(70) for _ in range(1000)))))
    session.start()
    session.record(tmp_path / "x.wav", ONE, seconds=0.5)
    gate.set()
    assert until(lambda: session.snapshot().recording).paths == (tmp_path / "x.wav",)
    finished(session)
    assert len(recorded(tmp_path / "x.wav")) == RATE_HZ // 2


def test_what_was_before_the_recording_can_be_part_of_it(tmp_path):
    gate = threading.Event()
    steps = chain([block(800)], [gate.wait], [block(100, first_frame=800)])
    session = Session(MadeSource(steps))
    session.start()
    until(lambda: session.snapshot().frames == 800)
    session.record(tmp_path / "x.wav", ONE, before_s=0.05)
    until(lambda: session.snapshot().recording)
    assert session.snapshot().recording.first_frame == 400
    gate.set()
    finished(session)
    want = (400 + np.arange(500)) % 1000 / 1000
    np.testing.assert_allclose(recorded(tmp_path / "x.wav")[:, 0], want, atol=1e-6)


def test_a_pause_leaves_a_marked_gap_and_the_meter_running(tmp_path):
    paused, resumed = threading.Event(), threading.Event()
    loud = block(np.full(300, 0.5), first_frame=100)
    steps = [block(100), paused.wait, loud, resumed.wait, block(100, first_frame=400)]
    begun = threading.Event()
    session = Session(MadeSource([begun.wait, *steps]))
    session.start()
    session.record(tmp_path / "x.wav", ONE)
    begun.set()
    until(lambda: session.snapshot().frames == 100)
    session.pause()
    until(lambda: session.snapshot().state == PAUSED)
    paused.set()
    until(lambda: session.snapshot().levels[0].peak == pytest.approx(0.5))
    session.resume()
    until(lambda: session.snapshot().state == RUNNING)
    resumed.set()
    finished(session)
    (gap,) = gaps_of(tmp_path / "x.wav")
    assert (gap.frame, gap.lost_frames, gap.cause, gap.exact) == (100, 300, "paused", True)
    assert len(recorded(tmp_path / "x.wav")) == 200


def test_a_pause_outlasts_an_absence_of_the_source(tmp_path):
    paused, resumed = threading.Event(), threading.Event()
    gone = SourceEnd("vanished", "made up is gone")
    steps = [block(100), paused.wait, gone, block(50), resumed.wait, block(100)]
    session = Session(MadeSource(steps), retry_every_s=0.0)
    listener = Gathering()
    session.add(listener)
    session.start()
    until(lambda: session.snapshot().frames == 100)
    session.pause()
    until(lambda: session.snapshot().state == PAUSED)
    paused.set()
    until(lambda: session.snapshot().message.startswith("made up is back"))
    assert session.snapshot().state == PAUSED
    session.resume()
    until(lambda: session.snapshot().state == RUNNING)
    resumed.set()
    finished(session)
    last = listener.blocks[-1]
    assert len(listener.blocks) == 2
    assert (last.first_frame, last.cause, last.exact) == (100, "paused", False)
    assert last.lost_frames > 50


def test_a_source_that_was_away_goes_on_behind_a_marked_gap(tmp_path):
    begun = threading.Event()
    gone = SourceEnd("vanished", "made up is gone")
    source = MadeSource([begun.wait, block(100), gone, block(100)])
    session = Session(source, retry_every_s=0.0)
    session.start()
    session.record(tmp_path / "x.wav", ONE)
    begun.set()
    shot = finished(session)
    (gap,) = gaps_of(tmp_path / "x.wav")
    assert (gap.frame, gap.cause, gap.exact) == (100, "made up is gone", False)
    assert gap.lost_frames > 0
    assert shot.gaps == 1
    assert source.starts == 2
    assert shot.message == "made up is back, and the gap is marked"


def test_while_the_source_is_away_the_user_is_told_what_is_safe(tmp_path):
    begun = threading.Event()
    source = MadeSource([begun.wait, block(100), SourceEnd("vanished", "made up is gone")])
    session = Session(source, retry_every_s=1e9)
    session.start()
    session.record(tmp_path / "x.wav", ONE)
    begun.set()
    until(lambda: session.snapshot().state == WAITING)
    assert session.snapshot().message == (
        "made up is gone: what was recorded is safe, and it goes on when the input is back"
    )
    session.stop()
    assert finished(session).recording.seconds == 100 / RATE_HZ


def test_a_source_that_stays_away_is_given_up():
    source = MadeSource([block(100), SourceEnd("vanished", "made up is gone")])
    shot = start_to_end(Session(source, retry_every_s=1e9, give_up_after_s=0.2))
    assert shot.failed
    assert "did not come back" in shot.message


def start_to_end(session):
    session.start()
    return finished(session)


def test_a_source_that_cannot_be_opened_ends_the_session_with_its_reason():
    class Locked(MadeSource):
        def start(self, deliver, ended):
            raise Refusal("made up is in use", "close the other program")

    shot = start_to_end(Session(Locked([])))
    assert (shot.state, shot.failed) == (ENDED, True)
    assert shot.message == "made up is in use; close the other program"


def test_a_source_with_a_fault_of_its_own_ends_in_a_sentence():
    class Broken(MadeSource):
        def start(self, deliver, ended):
            raise RuntimeError("boom")

    assert "RuntimeError: boom" in start_to_end(Session(Broken([]))).message


def test_losses_told_by_the_source_are_counted_and_marked(tmp_path):
    begun = threading.Event()
    lossy = [
        block(100),
        block(100, first_frame=100, lost_frames=7, cause="the input overflowed"),
        block(100, first_frame=200, lost_frames=None, cause="the input overflowed"),
        block(100, first_frame=300, lost_frames=9, cause="silence", exact=False, within_frames=50),
    ]
    session = Session(MadeSource([begun.wait, *lossy]))
    session.start()
    session.record(tmp_path / "x.wav", ONE)
    begun.set()
    shot = finished(session)
    assert (shot.lost_frames, shot.gaps) == (16, 3)
    gaps = gaps_of(tmp_path / "x.wav")
    assert [gap.lost_frames for gap in gaps] == [7, None, 9]
    assert [gap.range for gap in gaps] == [(100, 100), (200, 200), (250, 300)]


def test_a_listener_that_fails_is_taken_off_and_recording_goes_on(tmp_path):
    class Failing:
        def feed(self, _block):
            raise ValueError("no picture")

    begun = threading.Event()
    session = Session(MadeSource([begun.wait, block(100), block(100, first_frame=100)]))
    session.start()
    session.add(Failing())
    session.record(tmp_path / "x.wav", ONE)
    begun.set()
    shot = finished(session)
    assert "no picture" in shot.message
    assert len(recorded(tmp_path / "x.wav")) == 200


def test_the_last_seconds_can_be_had_without_a_gap_in_them():
    gate = threading.Event()
    steps = [
        *(block(100, first_frame=100 * i) for i in range(20)),
        block(100, first_frame=2000, lost_frames=5, cause="x"),
        block(100, first_frame=2100),
        gate.wait,
    ]
    session = Session(MadeSource(steps), keep_s=0.1)
    session.start()
    until(lambda: session.snapshot().frames == 2200)
    first, samples = session.latest()
    assert (first, samples.shape) == (2000, (200, 1))
    first, samples = session.latest(0.01)
    assert first == 2120
    np.testing.assert_allclose(samples[:, 0], (2120 + np.arange(80)) % 1000 / 1000, atol=1e-6)
    gate.set()
    finished(session)


def test_recording_needs_a_description_of_every_channel(tmp_path):
    session = Session(MadeSource([], channels=2))
    with pytest.raises(InputError, match=r"1 channel\(s\) are described"):
        session.record(tmp_path / "x.wav", ONE)


def test_a_session_may_be_stopped_at_any_time_and_records_no_more(tmp_path):
    session = Session(MadeSource(iter(lambda: block(10), None)))
    session.start()
    session.stop()
    assert finished(session).state == ENDED
    with pytest.raises(Refusal, match="made up is closed"):
        session.record(tmp_path / "x.wav", ONE)
    assert not list(tmp_path.iterdir())


def test_twenty_minutes_are_recorded_with_memory_flat(tmp_path):
    """Peak memory after 20 min of two channels is no higher than after the first minute."""
    minute = 60 * RATE_HZ
    peaks = []

    def steps():
        samples = np.random.default_rng(0).uniform(-1, 1, (4000, 2)).astype(np.float32)
        yield begun.wait
        for number in range(20 * minute // 4000):
            yield Block(4000 * number, samples)
            yield waits_for(lambda sent=4000 * (number + 1): written() >= sent - 16000)
            if (number + 1) * 4000 % minute == 0:
                peaks.append(tracemalloc.get_traced_memory()[1])

    def written():
        state = session.snapshot().recording
        return round(state.seconds * RATE_HZ) if state else 0

    begun = threading.Event()
    session = Session(MadeSource(steps(), channels=2), keep_s=2.0)
    tracemalloc.start()
    try:
        session.start()
        session.record(tmp_path / "x.wav", (ChannelSetup(), ChannelSetup()))
        begun.set()
        assert session.join(200.0)
    finally:
        tracemalloc.stop()
    assert len(peaks) == 20
    assert soundfile.info(tmp_path / "x.wav").frames == 20 * minute
    assert peaks[-1] <= peaks[0] + 1_000_000
    assert session.snapshot().lost_frames == 0
