"""Bad inputs: each ends in one sentence that names file, place and remedy, with exit status 2."""

from __future__ import annotations

import json

import numpy as np
import pytest
import soundfile

from tests.cli.running import fieldkit

JOB = """\
fieldkit = 1
title = "Glycol booster"

[pipe]
size = "NPS 3"
schedule = "40"
material = "carbon steel"

[[leg]]
direction = "+x"
length = "4.2 m"

[[support]]
at = "0 m"
kind = "anchor"

[[support]]
at = "4.2 m"
kind = "clamp"

[[excitation]]
name = "pump"
speed = "1480 rpm"
"""

TAP = """
[[recording]]
file = "{name}"
kind = "tap"
"""


def noise(frames):
    return 0.01 * np.random.default_rng(1).standard_normal(frames)


def not_audio(path):
    path.write_text("this is a shopping list, not a recording\n")


def truncated(path):
    soundfile.write(path, noise(40_000), 8000, subtype="PCM_16")
    path.write_bytes(path.read_bytes()[:300])


def empty(path):
    soundfile.write(path, np.zeros(0), 8000)


def silent(path):
    soundfile.write(path, np.zeros(16_000), 8000)


def with_nan(path):
    rows = [f"{i / 1000},{0.1 * (-1) ** i}" for i in range(2000)]
    rows[1200] = "1.2,nan"
    path.write_text("\n".join(["t (s),acc (m/s2)", *rows]))


def backwards(path):
    rows = [f"{i / 1000},{0.1 * (-1) ** i}" for i in range(2000)]
    rows[700] = "0.5,0.1"
    path.write_text("\n".join(["t (s),acc (m/s2)", *rows]))


RECORDINGS = {
    "unreadable": ("tap.wav", not_audio, ""),
    "truncated": ("tap.wav", truncated, ""),
    "empty": ("tap.wav", empty, ""),
    "silent": ("tap.wav", silent, "silent"),
    "NaN": ("tap.csv", with_nan, "line 1202"),
    "time backwards": ("tap.csv", backwards, "line 702"),
    "missing": ("tap.wav", lambda path: None, ""),
}


@pytest.mark.parametrize("name", RECORDINGS)
@pytest.mark.parametrize("command", ["peaks", "detune"])
def test_bad_recordings(tmp_path, name, command):
    file, write, says = RECORDINGS[name]
    write(tmp_path / file)
    job = tmp_path / "job.toml"
    job.write_text(JOB + TAP.format(name=file))
    ran = fieldkit(command, tmp_path / file if command == "peaks" else job)
    assert ran.status == 2, ran
    assert one_sentence(ran.err)
    assert file in ran.err
    assert says in ran.err


JOBS = {
    "unknown key": ('schedule = "40"', 'scedule = "40"', "line 6", "scedule"),
    "wrong unit": ('length = "4.2 m"', 'length = "4.2 kg"', "line 11", "length"),
    "support beyond the end": ('at = "4.2 m"', 'at = "5.2 m"', "line 18", "support"),
    "no such schedule": ('schedule = "40"', 'schedule = "41"', "line 6", "41"),
    "no such size": ('size = "NPS 3"', 'size = "NPS 3.3"', "line 5", "3.3"),
    "leg without length": ('length = "4.2 m"', 'length = "0 m"', "line 11", "leg"),
    "no such kind": ('kind = "clamp"', 'kind = "bracket"', "line 19", "bracket"),
    "no such direction": ('direction = "+x"', 'direction = "north"', "line 10", "north"),
    "not TOML": ('size = "NPS 3"', "size = NPS 3", "line 5", ""),
    "key said twice": ('schedule = "40"', 'schedule = "40"\nschedule = "80"', "line 7", ""),
    "negative stiffness": (
        'kind = "clamp"', 'kind = "clamp"\nvertical = "-2 MN/m"', "line 20", "vertical",
    ),
    "speeds in the wrong order": (
        'speed = "1480 rpm"', 'speed = ["1500 rpm", "1400 rpm"]', "line 23", "speed",
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", JOBS)
def test_bad_jobs(tmp_path, name):
    good, bad, line, says = JOBS[name]
    job = tmp_path / "job.toml"
    assert good in JOB
    job.write_text(JOB.replace(good, bad))
    ran = fieldkit("detune", job)
    assert ran.status == 2, ran
    assert one_sentence(ran.err)
    for part in ("job.toml", line, says):
        assert part in ran.err, ran.err


def test_legs_that_contradict_each_other(tmp_path):
    back = '[[leg]]\ndirection = "-x"\nlength = "4 m"\n\n[[support]]'
    job = tmp_path / "job.toml"
    job.write_text(JOB.replace("[[support]]", back, 1))
    ran = fieldkit("span", job)
    assert ran.status == 2, ran
    assert one_sentence(ran.err)
    assert "leg[1]" in ran.err


def test_a_job_without_excitation(tmp_path):
    job = tmp_path / "job.toml"
    job.write_text(JOB[: JOB.index("[[excitation]]")])
    assert fieldkit("span", job).status == 0
    ran = fieldkit("detune", job)
    assert ran.status == 2, ran
    assert "no excitation" in ran.err
    assert "job.toml" in ran.err
    assert one_sentence(ran.err)


def test_a_channel_that_is_not_there(tmp_path):
    path = tmp_path / "tap.wav"
    soundfile.write(path, noise(16_000), 8000)
    ran = fieldkit("peaks", path, "--channel", 3)
    assert ran.status == 2, ran
    assert "channel 3" in ran.err


@pytest.mark.parametrize("command", ["peaks", "running", "span", "match", "detune"])
def test_a_missing_file_is_bad_input_everywhere(tmp_path, command):
    ran = fieldkit(command, tmp_path / "nowhere.toml")
    assert ran.status == 2, ran
    assert "nowhere.toml" in ran.err
    assert one_sentence(ran.err)


def test_with_json_the_error_is_the_one_document(tmp_path):
    ran = fieldkit("detune", tmp_path / "nowhere.toml", "--json")
    assert ran.status == 2
    assert "nowhere.toml" in json.loads(ran.out)["error"]


def test_escape_sequences_in_a_job_never_reach_the_terminal(tmp_path):
    job = tmp_path / "job.toml"
    hostile = JOB.replace('"Glycol booster"', r'"\u001b]0;owned\u0007[bold]x[/bold]"')
    job.write_text(hostile.replace('kind = "clamp"', r'kind = "\u001b[2Jclamp"'))
    ran = fieldkit("span", job)
    assert ran.status == 2
    assert "\x1b" not in ran.err + ran.out


def one_sentence(text):
    """One line, no traceback, and something to do about it."""
    return text.count("\n") == 1 and "Traceback" not in text and ";" in text
