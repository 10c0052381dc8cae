"""``fieldkit devices`` and ``fieldkit record``, through real PortAudio."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys

import numpy as np
import pytest
import soundfile

from fieldkit.capture.sidecar import read_info
from fieldkit.errors import InputError
from fieldkit.job.schema import load_job
from fieldkit.job.store import new_job_text
from fieldkit.workup import entry_for
from tests.capture.kill_table import played_noise
from tests.capture.rig import GENEROUS_S, until
from tests.cli.running import fieldkit

SETUP = ("--sensitivity", "100 mV/g", "--full-scale", "1.4 V", "--direction", "vertical")


@pytest.fixture
def job(tmp_path):
    path = tmp_path / "job.toml"
    new_job_text().save(path)
    return path


@pytest.fixture(autouse=True)
def _own_settings(monkeypatch, tmp_path):
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path / "settings"))


def test_devices_lists_the_inputs(bench):
    ran = fieldkit("devices", "--json")
    assert ran.status == 0
    inputs = {device["name"]: device for device in ran.document["inputs"]}
    assert set(inputs["bench"]) == {
        "index", "name", "host_api", "channels", "default_rate_hz", "rates_hz", "default",
    }  # fmt: skip
    assert 48000 in inputs["bench"]["rates_hz"]
    lines = fieldkit("devices").out.splitlines()
    assert any("bench" in line and "ALSA" in line and "44.1 48" in line for line in lines)


def test_record_makes_a_file_of_the_stated_length(bench, tmp_path):
    path = tmp_path / "x.wav"
    bench.play(played_noise())
    ran = fieldkit(
        "record", path, "--device", "bench", "--rate", 48000, "--channels", 2, "--seconds", 1.5,
        *SETUP, "--at", "1 m", "--at", "2 m", "--json",
    )  # fmt: skip
    assert ran.status == 0, ran.err
    assert soundfile.info(path).frames == 72000
    assert ran.document == {
        "files": [str(path)], "job": None, "device": "bench", "rate_hz": 48000, "channels": 2,
        "duration_s": 1.5, "simulated": False, "clipped_samples": [0, 0], "gaps": [],
    }  # fmt: skip
    info = read_info(path)
    assert [setup.at for setup in info.channels] == ["1 m", "2 m"]
    assert {setup.direction for setup in info.channels} == {"vertical"}
    assert info.ended == "it has its length"
    ran = fieldkit("running", path, "--json")
    assert ran.status == 0, ran.err
    assert "m/s" in fieldkit("running", path).out


def test_record_adds_to_a_job_what_it_recorded(bench, job):
    for name in ("tap-1.wav", "tap-2.wav"):
        ran = fieldkit(
            "record", job, "--device", "bench", "--seconds", 0.3, *SETUP, "--at", "1.9 m"
        )
        assert ran.status == 0, ran.err
        assert f"{name}: 0.30 s" in ran.out
        assert "added to job.toml" in ran.out
    first, second = load_job(job).recordings
    assert (first.path.name, second.path.name) == ("tap-1.wav", "tap-2.wav")
    assert (first.kind, first.direction, first.at_m) == ("tap", "vertical", 1.9)
    assert first.scale == pytest.approx(14 * 9.80665)
    assert first.path.exists()


def test_a_hammer_is_recorded_beside_the_sensor(bench, job, tmp_path):
    words = (
        "--device", "bench", "--seconds", 0.3, "--quantity", "acceleration", "--quantity", "force",
        "--sensitivity", "100 mV/g", "--sensitivity", "2.3 mV/N", "--full-scale", "1 V",
        "--at", "1.9 m", "--at", "2.1 m",
    )  # fmt: skip
    assert fieldkit("record", job, *words).status == 0
    (entry,) = load_job(job).recordings
    assert (entry.channel, entry.quantity, entry.at_m) == (1, "acceleration", 1.9)
    assert (entry.hammer.channel, entry.hammer.at_m) == (2, 2.1)
    assert entry.hammer.scale == pytest.approx(1 / 2.3e-3)
    alone = entry_for(tmp_path / "tap-1.wav", "tap")
    assert (alone.hammer, alone.scale) == (entry.hammer, entry.scale)
    with pytest.raises(InputError, match="channel 2 is the hammer's"):
        entry_for(tmp_path / "tap-1.wav", "tap", channel=2)


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (("job.toml", "--quantity", "force"), "no channel has a sensor"),
        (("x.flac",), "WAV"),
        (("x.wav", "--kind", "nap"), "not a kind of recording"),
        (("x.wav", "--sensitivity", "3 kg"), "sensitivity"),
        (("x.wav", "--channels", "3", "--at", "1 m", "--at", "2 m"), "--at is given 2 times"),
        (("x.wav", "--device", "nothing"), "no input called 'nothing'"),
        (("x.wav", "--channels", "99"), "99 were asked for"),
        (("x.wav", "--preset", "mine"), "there is no preset 'mine'"),
        (("none.toml",), "none.toml"),
        (("job.toml", "--at", "99 m"), "beyond the end of the span"),
    ],
)
def test_what_cannot_be_done_is_told_and_nothing_is_left(
    bench, job, tmp_path, monkeypatch, words, says
):
    monkeypatch.chdir(tmp_path)
    ran = fieldkit("record", *words, "--seconds", 0.3)
    assert ran.status == 2
    assert says in ran.err
    assert ran.err.count("\n") == 1
    assert not list(tmp_path.glob("x.*"))
    assert not list(tmp_path.glob("*.wav"))


def test_no_recording_is_overwritten(bench, tmp_path):
    (tmp_path / "x.wav").write_bytes(b"mine")
    ran = fieldkit("record", tmp_path / "x.wav", "--seconds", 0.3)
    assert ran.status == 2
    assert "never overwritten" in ran.err or "ever overwritten" in ran.err
    assert (tmp_path / "x.wav").read_bytes() == b"mine"


def test_a_set_up_is_kept_and_used_again(bench, tmp_path):
    words = ("--device", "bench", "--seconds", 0.2)
    ran = fieldkit("record", tmp_path / "a.wav", *words, "--rate", 48000, *SETUP, "--keep", "mine")
    assert ran.status == 0, ran.err
    ran = fieldkit(
        "record", tmp_path / "b.wav", "--seconds", 0.2, "--preset", "mine", "--direction", "lateral"
    )
    assert ran.status == 0, ran.err
    info = read_info(tmp_path / "b.wav")
    assert (info.device, info.rate_hz) == ("bench", 48000)
    assert info.channels[0].sensitivity == "100 mV/g"
    assert info.channels[0].direction == "lateral"


def recorder(bench, path, *words):
    """The command in a process of its own."""
    return subprocess.Popen(
        [sys.executable, "-m", "fieldkit", "record", str(path), "--device", "bench", *words],
        env=os.environ | bench.environment,
        stdin=subprocess.DEVNULL,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )


def some_frames(path):
    return path.exists() and path.stat().st_size > 20_000


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_ctrl_c_ends_a_recording_well(bench, tmp_path, number):
    path = tmp_path / "x.wav"
    process = recorder(bench, path, "--json")
    until(lambda: some_frames(path) or process.poll() is not None)
    process.send_signal(number)
    out, err = process.communicate(timeout=GENEROUS_S)
    assert process.returncode == 0, err
    assert err == ""
    assert json.loads(out)["duration_s"] > 0
    assert read_info(path).ended == "stopped by the user"


def test_a_recording_on_a_frozen_server_can_be_ended(bench, tmp_path):
    path = tmp_path / "x.wav"
    process = recorder(bench, path)
    until(lambda: some_frames(path) or process.poll() is not None)
    bench.freeze()
    process.send_signal(signal.SIGINT)
    out, err = process.communicate(timeout=20.0)
    assert process.returncode == 0, err
    assert "x.wav" in out
    assert soundfile.info(path).frames > 0
    bench.thaw()


def test_a_device_that_stays_away_ends_the_recording_with_what_was_recorded(bench, tmp_path):
    path = tmp_path / "x.wav"
    process = recorder(bench, path, "--json", "--wait", "1")
    until(lambda: some_frames(path) or process.poll() is not None)
    bench.kill()
    out, err = process.communicate(timeout=GENEROUS_S)
    assert process.returncode == 1, err
    assert json.loads(out)["refused"] == "bench did not come back within 1 s"
    assert err == "fieldkit: bench did not come back within 1 s\n"
    assert np.isclose(json.loads(out)["duration_s"], soundfile.info(path).duration)
