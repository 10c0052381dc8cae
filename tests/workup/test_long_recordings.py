"""A recording read in blocks gives a job what the same recording gives when it is loaded."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
import soundfile

from fieldkit.errors import Cancelled, InputError
from fieldkit.job.document import HammerEntry, RecordingEntry
from fieldkit.progress import Progress
from fieldkit.signal import long_taps, recording, source
from fieldkit.workup import (
    TapReading,
    evidence_from,
    read_running_entry,
    read_tap,
    tap_readings,
)
from tests.signal.made_blows import HalfSine
from tests.signal.made_running import machine, stirred
from tests.workup.struck_pipe import entry, write

BLOWS = tuple(HalfSine(3.0 + 6.5 * i, 60.0 + 10.0 * i) for i in range(5))
DOUBLE = (*BLOWS[:2], HalfSine(BLOWS[1].at_s + 0.08, 50.0), *BLOWS[2:])


@pytest.fixture
def in_blocks(monkeypatch: pytest.MonkeyPatch) -> None:
    """As if nothing fitted into memory."""
    monkeypatch.setattr(source, "LONG_SAMPLES", 0)
    monkeypatch.setattr(long_taps, "STRETCH_S", 12.0)


@pytest.fixture(scope="module")
def struck(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return write(tmp_path_factory.mktemp("struck") / "tap.wav", DOUBLE)


@pytest.fixture(scope="module")
def loaded(struck: Path) -> TapReading:
    return read_tap(entry(struck))


@pytest.fixture
def shaken(tmp_path: Path) -> Path:
    signal = stirred(((17.0, 0.012), (43.0, 0.01)), seed=3, rate_hz=600)
    signal += machine(((24.5, 1.0), (49.0, 0.6)), len(signal), seed=4)
    path = tmp_path / "running.wav"
    soundfile.write(path, 0.1 * signal / np.abs(signal).max(), 600, subtype="FLOAT")
    return path


@pytest.mark.usefixtures("in_blocks")
def test_taps_and_modes_are_those_of_the_loaded_recording(struck: Path, loaded: TapReading):
    ours = read_tap(entry(struck))
    assert [t.usable for t in ours.search.taps] == [t.usable for t in loaded.search.taps]
    assert [t.usable for t in ours.search.taps] == [True, False, True, True, True]
    assert len(ours.records) == len(loaded.records) == 4
    assert (ours.rate_hz, ours.channels, ours.duration_s) == (4096, 2, loaded.duration_s)
    assert ours.notes == loaded.notes == ()
    mine, reference = (evidence_from([r], None, Progress()).modes for r in (ours, loaded))
    assert len(mine) == len(reference) == 2
    for a, b in zip(mine, reference, strict=True):
        assert a.frequency_hz == pytest.approx(b.frequency_hz, abs=b.frequency_sd_hz)
        assert a.damping_ratio == pytest.approx(b.damping_ratio, abs=b.damping_sd)


@pytest.mark.usefixtures("in_blocks")
def test_hammer_says_the_same(struck: Path, loaded: TapReading):
    """Response and coherence, from the force of every blow that is kept."""
    ours = read_tap(entry(struck)).hammer
    reference = loaded.hammer
    assert ours is not None
    assert reference is not None
    assert ours.response is not None
    assert reference.response is not None
    assert ours.notes == reference.notes
    near = (reference.response.frequency_hz > 5) & (reference.response.frequency_hz < 100)
    mine = np.interp(
        reference.response.frequency_hz[near],
        ours.response.frequency_hz,
        np.abs(ours.response.h1),
    )
    np.testing.assert_allclose(mine, np.abs(reference.response.h1)[near], rtol=0.02)


@pytest.mark.usefixtures("in_blocks")
def test_hammer_judges_blows_that_are_not_kept_too(struck: Path, monkeypatch):
    monkeypatch.setattr(long_taps, "MOST_TAPS", 2)
    ours = read_tap(entry(struck))
    assert [t.usable for t in ours.search.taps] == [True, False, True, True, True]
    assert len(ours.records) == 2
    assert ours.hammer is not None
    assert ours.hammer.response is not None
    assert "2 of 4 usable taps" in ours.notes[0]


@pytest.mark.usefixtures("in_blocks")
def test_hammer_on_a_channel_that_is_not_there_is_refused(struck: Path):
    with pytest.raises(InputError, match="its hammer is said to be on channel 3"):
        read_tap(entry(struck, hammer=HammerEntry(3)))


def test_running_picture_and_modes_are_those_of_the_loaded_recording(shaken: Path, monkeypatch):
    of = RecordingEntry(shaken, "running", "running", direction="lateral", at_m=2.5)
    reference = read_running_entry(of, 80.0)
    monkeypatch.setattr(source, "LONG_SAMPLES", 0)
    ours = read_running_entry(of, 80.0)
    for found in (reference, ours):
        assert {24.5, 49.0} <= {round(x.frequency_hz, 1) for x in found.picture.lines}
        assert found.modes is not None
        assert [round(m.frequency_hz) for m in found.modes.modes] == [17, 43]
    assert ours.modes is not None
    assert ours.modes.modes[0].direction == "lateral"
    assert ours.picture.overall_rms == pytest.approx(reference.picture.overall_rms, rel=0.02)
    read, looked_for = ours.notes
    assert read.startswith("read in blocks")
    assert looked_for.startswith("natural frequencies were looked for in")


@pytest.mark.usefixtures("in_blocks")
def test_recorder_that_lost_its_power_gives_what_it_wrote(struck: Path, tmp_path: Path):
    """Cut off in the middle of the file, as WAV and as FLAC."""
    samples, rate_hz = soundfile.read(struck)
    for name in ("cut.wav", "cut.flac"):
        path = tmp_path / name
        soundfile.write(path, samples, rate_hz, subtype="PCM_24")
        path.write_bytes(path.read_bytes()[: int(0.6 * path.stat().st_size)])
        found = read_tap(replace(entry(path), hammer=None))
        assert len(found.search.taps) == 3
        assert found.duration_s < 0.63 * len(samples) / rate_hz
        assert "ends early" in found.notes[0]


@pytest.mark.usefixtures("in_blocks")
def test_file_that_breaks_off_in_its_middle_gives_what_comes_before(struck: Path, tmp_path: Path):
    samples, rate_hz = soundfile.read(struck)
    path = tmp_path / "bad.flac"
    soundfile.write(path, samples[:, 0], rate_hz, subtype="PCM_16")
    data = bytearray(path.read_bytes())
    middle = int(0.7 * len(data))
    data[middle : middle + 2000] = np.random.default_rng(1).bytes(2000)
    path.write_bytes(data)
    found = read_tap(replace(entry(path), hammer=None))
    assert len(found.search.taps) >= 3
    assert found.duration_s < 0.8 * len(samples) / rate_hz
    assert "damaged or ends early" in found.notes[0]


@pytest.mark.usefixtures("in_blocks")
def test_nothing_is_loaded_whole(struck: Path, shaken: Path, monkeypatch):
    def refuse(*_args: object) -> None:
        raise AssertionError("loaded")

    monkeypatch.setattr(recording, "read_audio", refuse)
    assert read_tap(entry(struck)).records
    assert read_running_entry(RecordingEntry(shaken, "running", "running"), 80.0).picture.lines


@pytest.mark.usefixtures("in_blocks")
def test_progress_rises_through_all_recordings_and_stops_on_request(struck: Path):
    told: list[float] = []
    entries = [entry(struck), entry(struck)]
    tap_readings(entries, Progress(lambda _message, fraction: told.append(fraction)))
    assert told == sorted(told)
    assert len(told) > 6
    assert 0.3 < told[-1] <= 0.5
    told.clear()
    stopping = Progress(lambda _message, f: told.append(f), lambda: len(told) >= 3)
    with pytest.raises(Cancelled):
        tap_readings(entries, stopping)
