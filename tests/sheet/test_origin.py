"""The mark on whatever rests on simulated recordings."""

from __future__ import annotations

from pathlib import Path

from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.sidecar import RecordingInfo, sidecar_path, write_info
from fieldkit.job.document import RecordingEntry
from fieldkit.sheet.origin import marked


def entry(path: Path, *, simulated: bool) -> RecordingEntry:
    info = RecordingInfo("rig", 8000, (ChannelSetup(),), "2026-01-01T08:00:00", simulated)
    write_info(path, info)
    return RecordingEntry(path, "tap", "tapped")


def test_one_simulated_recording_marks_the_whole_answer(tmp_path: Path) -> None:
    """Named once, however many channels of it a job uses."""
    real = entry(tmp_path / "real.wav", simulated=False)
    made = entry(tmp_path / "made.wav", simulated=True)
    document, lines = marked({"modes": []}, ["Modes"], [real, made, made])
    assert document == {"modes": [], "simulated": True}
    assert lines[0].startswith("! SIMULATED: made.wav came from the practice rig")
    assert lines[-1] == "Modes"


def test_measured_recordings_carry_no_mark(tmp_path: Path) -> None:
    """Nor does one without a sidecar, or with a damaged one, which its reader is told of."""
    real = entry(tmp_path / "real.wav", simulated=False)
    bare = RecordingEntry(tmp_path / "bare.wav", "tap", "tapped")
    broken = RecordingEntry(tmp_path / "broken.wav", "tap", "tapped")
    sidecar_path(broken.path).write_text("?", "utf-8")
    answer = marked({}, ["Modes"], [real, bare, broken])
    assert answer == ({"simulated": False}, ["Modes"])
