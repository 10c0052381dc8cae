"""Blows set aside are marked beside the recording that holds them."""

from __future__ import annotations

import threading

from fieldkit.capture.session import Session
from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.sidecar import RecordingInfo, read_info
from fieldkit.capture.writer import RecordingWriter
from tests.capture.made_source import RATE_HZ, MadeSource, block, waits_for

ONE = (ChannelSetup(),)


def aside(path):
    info = read_info(path)
    assert info is not None
    return info.set_aside


def test_the_mark_counts_in_the_file_and_can_be_taken_away(tmp_path):
    """The recording begins at frame 300 of the session, and 50 frames are lost by a gap that is
    not counted; parts of 200 frames."""
    path = tmp_path / "x.wav"
    info = RecordingInfo("made up", RATE_HZ, ONE, "2026-01-01T00:00:00+00:00")
    writer = RecordingWriter(path, info, part_frames=200)
    writer.feed(block(150, first_frame=300))
    writer.feed(block(150, first_frame=450, lost_frames=50, cause="lost"))
    writer.set_aside(350, True)
    writer.set_aside(520, True)
    writer.close("done")
    assert (aside(path), aside(tmp_path / "x-part2.wav")) == ((50,), (20,))
    writer.set_aside(350, False)
    writer.set_aside(360, True)
    assert aside(path) == (60,)
    assert writer.trouble == ""


def test_a_session_marks_the_recording_that_holds_the_blow(tmp_path):
    """Also an earlier one that is closed."""
    first, second = tmp_path / "a.wav", tmp_path / "b.wav"
    gate, later, end = threading.Event(), threading.Event(), threading.Event()
    steps = [gate.wait, block(400), later.wait, block(400, first_frame=400), end.wait]
    session = Session(MadeSource(steps))
    session.start()
    session.record(first, ONE)
    gate.set()
    waits_for(lambda: session.snapshot().frames == 400)()
    session.record(second, ONE)
    later.set()
    waits_for(lambda: session.snapshot().frames == 800)()
    session.set_aside(100)
    session.set_aside(450)
    session.stop()
    assert session.join(60.0)
    end.set()
    assert (aside(first), aside(second)) == ((100,), (50,))
