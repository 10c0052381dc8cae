"""``fieldkit recheck``: the contract of the answer, and one sentence for bad input."""

from __future__ import annotations

import json

import pytest

from tests.cli.running import fieldkit
from tests.workup.retapped import JOB, brace, record

KEYS = {
    "verdict", "because", "measure_next", "fix", "state", "chance_before", "chance_now", "margin",
    "margin_measured", "predicted", "unexplained", "modes", "bands", "found", "ways", "reasons",
    "mended", "next_fixes", "effective_members", "recordings", "warnings", "simulated",
}  # fmt: skip


def test_the_answer_is_one_document_and_an_adopted_job_gives_the_same_change(tmp_path):
    """The job with the change in it, and the one before, name the change between them."""
    from fieldkit.detune.fixes import AddSupport
    from fieldkit.job.store import load_text

    change = AddSupport(0.4, 5e5, 5e5)
    job = load_text(JOB)
    new = tmp_path / "now.toml"
    job.with_change(change).save(new)
    for recording in JOB.parent.glob("*.flac"):
        (tmp_path / recording.name).write_bytes(recording.read_bytes())
    after = tmp_path / "after"
    after.mkdir()
    files = record(after, brace(0.4, 5e5, 5e5))
    ran = fieldkit("recheck", new, *files, "--before", JOB, "--json")
    assert ran.status == 0, ran.err
    found = ran.document
    assert set(found) == KEYS
    assert found["verdict"] in ("worked", "did_not_work", "cannot_say")
    assert found["fix"]["change"]["add_support"]["at_m"] == pytest.approx(0.4, abs=1e-3)
    assert found["fix"]["rank"] is None
    assert sum(one["probability"] for one in found["ways"]) == pytest.approx(1.0)
    assert found["ways"][0]["way"] == "as drawn"
    assert set(found["predicted"][0]) == {
        "direction", "low_hz", "median_hz", "high_hz", "measured_hz", "measured_sd_hz", "inside",
    }  # fmt: skip
    assert set(found["modes"][0]) == {
        "direction", "low_hz", "median_hz", "high_hz", "measured_hz", "margin", "chance_clear",
        "nearest",
    }  # fmt: skip


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (("gone.wav",), "no such file"),
        (("tap.wav", "--fill", "2"), "fill"),
        (("tap.wav", "--like", "9"), "no recording 9"),
    ],
)
def test_bad_input_is_one_sentence(tmp_path, monkeypatch, words, says):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "tap.wav").write_bytes(b"no samples")
    ran = fieldkit("recheck", JOB, *words, "--json")
    assert ran.status == 2
    assert says in json.loads(ran.out)["error"]
    assert ran.err.count("\n") == 1


def test_a_job_that_is_not_there_is_bad_input(tmp_path):
    ran = fieldkit("recheck", tmp_path / "none.toml", tmp_path / "a.wav")
    assert ran.status == 2
    assert "none.toml" in ran.err


def test_help_has_an_example():
    ran = fieldkit("recheck", "--help")
    assert ran.status == 0
    assert "Example: fieldkit recheck" in ran.out
