"""What stands beside a recording of our own reaches the reading: set-up, gaps, origin."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import soundfile

from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.sidecar import Gap, RecordingInfo, sidecar_path, write_info
from fieldkit.errors import InputError
from fieldkit.signal.taps import find_taps
from fieldkit.workup import entry_for, read_running_entry, read_tap
from tests.signal.made_taps import Blow, Made, coloured, tap_recording

RATE_HZ = 4000
BLOWS_S = (2.0, 6.0, 10.0)
SETUP = ChannelSetup(sensitivity="100 mV/g", full_scale="1 V", direction="vertical", at="1.9 m")
INFO = RecordingInfo(
    "made up", RATE_HZ, (SETUP,), "2026-01-01T00:00:00+00:00", ended="stopped by the user"
)


def samples():
    rng = np.random.default_rng(0)
    ringing = tap_recording([Made(31.0, 0.012)], [Blow(at) for at in BLOWS_S], 14.0, RATE_HZ)
    noisy = ringing + coloured(rng, len(ringing), RATE_HZ, 1e-6)
    return 0.5 * noisy / np.abs(noisy).max()


@pytest.fixture
def recording(tmp_path):
    """Three good blows."""
    path = tmp_path / "tap.wav"
    soundfile.write(path, samples(), RATE_HZ, subtype="PCM_24")
    return path


def usable(reading):
    return [tap.usable for tap in reading.search.taps]


def test_without_a_sidecar_nothing_changes(recording):
    entry = entry_for(recording, "tap")
    assert (entry.scale, entry.direction, entry.at_m) == (None, None, None)
    reading = read_tap(entry)
    assert usable(reading) == [True, True, True]
    assert reading.notes == ()


def test_a_recording_no_job_describes_is_read_with_the_set_up_it_was_made_with(recording):
    write_info(recording, INFO)
    entry = entry_for(recording, "tap")
    assert (entry.quantity, entry.direction, entry.at_m) == ("acceleration", "vertical", 1.9)
    assert entry.scale == pytest.approx(98.0665)
    assert read_tap(entry).notes == ()


def test_a_tap_with_a_gap_in_it_is_refused_with_that_reason(recording):
    write_info(recording, INFO.with_gap(Gap(7 * RATE_HZ, 480, "the input overflowed")))
    reading = read_tap(entry_for(recording, "tap"))
    assert usable(reading) == [True, False, True]
    assert reading.search.taps[1].reasons[0] == (
        "frames are missing inside it, at 7.00 s: the decay is not whole; tap again"
    )
    assert len(reading.records) == 2
    assert reading.notes == ("frames are missing at 7.00 s (the input overflowed, 0.12 s)",)


def test_a_gap_that_may_lie_in_a_tap_refuses_it_too(recording):
    gap = Gap(round(9.5 * RATE_HZ), None, "silently", exact=False, earliest_frame=7 * RATE_HZ)
    write_info(recording, INFO.with_gap(gap))
    assert usable(read_tap(entry_for(recording, "tap")))[1] is False


def test_the_click_of_a_gap_is_no_usable_tap():
    """Frames taken out of a ringing signal leave a step, which may look like a blow."""
    whole = samples()
    at, lost = round(6.3 * RATE_HZ), 57
    spliced = np.concatenate([whole[:at], whole[at + lost :]])
    search = find_taps(spliced, RATE_HZ, gaps=[(at, at)])
    good = [tap.at_s for tap in search.taps if tap.usable]
    assert good == pytest.approx([2.0, 10.0 - lost / RATE_HZ], abs=0.05)


def test_the_background_is_taken_where_it_is_whole():
    search = find_taps(samples(), RATE_HZ, gaps=[(RATE_HZ // 2, RATE_HZ // 2)])
    assert search.background[0] == RATE_HZ // 2
    assert all(tap.usable for tap in search.taps)


def test_a_running_recording_is_read_where_it_is_whole(tmp_path):
    path = tmp_path / "run.wav"
    time_s = np.arange(20 * RATE_HZ) / RATE_HZ
    tone = 0.1 * np.sin(2 * np.pi * 50.0 * time_s)
    soundfile.write(path, tone, RATE_HZ, subtype="PCM_24")
    gaps = (Gap(3 * RATE_HZ, 100, "a"), Gap(15 * RATE_HZ, None, "b"))
    write_info(path, replace(INFO, gaps=gaps, simulated=True))
    reading = read_running_entry(entry_for(path, "running"))
    assert reading.notes == (
        "simulated by made up: nothing was measured",
        "frames are missing at 3.00 s (a, 0.03 s), at 15.00 s (b)",
        "read from 3.00 s to 15.00 s, the longest stretch without a gap",
    )


def test_a_recording_that_was_cut_off_says_so(recording):
    write_info(recording, replace(INFO, ended=""))
    (note,) = read_tap(entry_for(recording, "tap")).notes
    assert note.startswith("it was cut off")


def test_a_sidecar_of_another_recording_is_told(recording):
    write_info(recording, replace(INFO, rate_hz=8000))
    with pytest.raises(InputError, match=r"tap\.wav\.toml: it tells of 1 channel\(s\) at 8000 Hz"):
        read_tap(entry_for(recording, "tap"))


@pytest.mark.parametrize(
    "text",
    [
        "[",
        "x = 1",
        "fieldkit_recording = 2",
        'fieldkit_recording = 1\ndevice = "d"\nrate_hz = "fast"\nstarted = ""\nsimulated = false\n'
        "channel = []",
        'fieldkit_recording = 1\ndevice = "d"\nrate_hz = 4000\nstarted = ""\nsimulated = false\n'
        '[[channel]]\nquantity = "colour"',
    ],
)
def test_a_damaged_sidecar_is_told_with_its_file(recording, text):
    sidecar_path(recording).write_text(text)
    with pytest.raises(InputError, match=r"tap\.wav\.toml"):
        read_tap(entry_for(recording, "tap"))


def test_a_blow_the_user_set_aside_does_not_count_and_says_so(recording):
    """Its samples stay in the recording."""
    write_info(recording, replace(INFO, set_aside=(round(6.0 * RATE_HZ),)))
    reading = read_tap(entry_for(recording, "tap"))
    assert usable(reading) == [True, False, True]
    assert reading.search.taps[1].reasons == ("set aside by the user",)
    assert len(reading.records) == 2
