"""``fieldkit record --practice`` and ``--calibrate``: no sensor, no sound card."""

from __future__ import annotations

import shutil
import threading

import pytest

from fieldkit.capture.clock import now_s
from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.sidecar import RecordingInfo, read_info, write_info
from fieldkit.cli.samples import sample_jobs
from fieldkit.job.schema import load_job
from tests.cli.running import fieldkit


class TenTimesAsFast:
    """A clock that runs ahead of the one on the wall."""

    def now_s(self) -> float:
        return 10 * now_s()

    def wait(self, seconds: float, stop: threading.Event) -> None:
        stop.wait(seconds / 10)


@pytest.fixture(autouse=True)
def _in_a_hurry(monkeypatch):
    monkeypatch.setattr("fieldkit.capture.practice.RealTime", TenTimesAsFast)


@pytest.fixture
def job(tmp_path):
    path = tmp_path / "job.toml"
    shutil.copy(sample_jobs()[0], path)
    text = path.read_text("utf-8")
    path.write_text(text[: text.index("[[recording]]")] + text[text.index("[goal]") :], "utf-8")
    return path


def test_a_practice_recording_is_added_to_the_job_and_says_that_it_is_simulated(job) -> None:
    """Place, direction and sensitivity are filled in; peaks repeats where it comes from."""
    ran = fieldkit("record", job, "--practice", "--seconds", 9, "--rate", 4000, "--json")
    assert ran.status == 0, ran.err
    assert ran.document["simulated"] is True
    info = read_info(job.parent / "tap-1.wav")
    assert info is not None
    assert info.simulated
    entry = load_job(job).recordings[0]
    assert (entry.direction, entry.at_m) == ("vertical", 1.43)
    assert entry.scale == pytest.approx(68.6, rel=1e-3)
    told = fieldkit("peaks", job.parent / "tap-1.wav", "--json")
    assert any("simulated by the practice rig" in warning for warning in told.document["warnings"])
    assert told.document["recordings"][0]["taps"]


def test_an_answer_that_rests_on_the_rig_says_so(job) -> None:
    """Match, detuning and advice name the recordings that were simulated."""
    record = ("record", job, "--practice", "--seconds", 20, "--rate", 4000)
    assert fieldkit(*record, "--direction", "lateral").status == 0
    said = "tap-1.wav: simulated by the practice rig: nothing was measured"
    assert said in fieldkit("match", job, "--json").document["warnings"]
    detuned = fieldkit("detune", job, "--json").document
    assert detuned["warnings"].count(said) == 1
    assert detuned["fixes"]
    assert " ".join(fieldkit(job).out.split()).count(said) == 1


def test_a_calibration_stands_in_the_job_with_date_and_result(job) -> None:
    """Written into what has no sensitivity yet, told as a comment for a person."""
    text = job.read_text("utf-8").replace(
        "[goal]", '[[recording]]\nfile = "old.wav"\nkind = "tap"\n\n[goal]'
    )
    job.write_text(text, "utf-8")
    made = RecordingInfo("the practice rig", 8000, (ChannelSetup(),), "2026-01-01", simulated=True)
    write_info(job.parent / "old.wav", made)
    ran = fieldkit("record", job, "--practice", "--calibrate", "--reference", "1 g", "--json")
    assert ran.status == 0, ran.err
    assert ran.document["sensitivity"] == "103 mV/g"
    assert ran.document["calibrated_recordings"] == ["old.wav"]
    assert ran.document["reference_m_per_s2_rms"] == pytest.approx(9.80665)
    written = job.read_text("utf-8")
    assert f"# channel 1 calibrated {ran.document['date']}" in written
    assert "simulated by the practice rig" in written
    assert load_job(job).recordings[0].scale == pytest.approx(0.7 / 0.103 * 9.80665, rel=1e-3)


def test_what_does_not_go_together_is_refused(job) -> None:
    """An input and the rig; a channel that is not there; a reference of nothing."""
    assert fieldkit("record", job, "--practice", "--device", "x").status == 2
    ran = fieldkit("record", job, "--practice", "--calibrate", "--channel", 3)
    assert (ran.status, "no channel 3" in ran.err) == (2, True)
    assert fieldkit("record", job, "--practice", "--calibrate", "--reference", "0 g").status == 2


def test_a_set_up_kept_on_the_rig_serves_the_rig_alone(job, monkeypatch) -> None:
    """Its sensitivity was found on no sensor; calibrated again on the rig it is the same."""
    monkeypatch.setenv("XDG_CONFIG_HOME", str(job.parent / "settings"))
    words = ("record", job, "--practice", "--calibrate", "--json")
    first = fieldkit(*words, "--keep", "mine")
    assert first.status == 0, first.err
    again = fieldkit(*words, "--preset", "mine")
    assert again.status == 0, again.err
    assert again.document["sensitivity"] == first.document["sensitivity"] == "103 mV/g"
    real = fieldkit("record", job.parent / "x.wav", "--preset", "mine", "--seconds", 1)
    assert (real.status, "was kept on the practice rig" in real.err) == (2, True)


@pytest.mark.parametrize("words", [("--seconds", 1), ("--calibrate",)])
def test_simulated_and_measured_data_never_meet_in_a_job(job, words) -> None:
    """Neither way round, and nothing is written."""
    text = job.read_text("utf-8").replace(
        "[goal]", '[[recording]]\nfile = "real.wav"\nkind = "tap"\n\n[goal]'
    )
    job.write_text(text, "utf-8")
    ran = fieldkit("record", job, "--practice", *words)
    assert (ran.status, "what was measured" in ran.err) == (2, True)
    made = RecordingInfo("the practice rig", 8000, (ChannelSetup(),), "2026-01-01", simulated=True)
    write_info(job.parent / "real.wav", made)
    ran = fieldkit("record", job, *words)
    assert (ran.status, "holds simulated recordings" in ran.err) == (2, True)
    assert job.read_text("utf-8") == text
