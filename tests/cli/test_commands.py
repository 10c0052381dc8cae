"""The commands on the sample jobs: the contract of each answer."""

from __future__ import annotations

import subprocess
import sys
from functools import cache
from pathlib import Path

import pytest

from fieldkit.cli.samples import sample_jobs
from fieldkit.sheet.plain import percent
from tests.cli.running import fieldkit

JOBS = {path.parent.name: path for path in sample_jobs()}
BOOSTER = JOBS["glycol-booster"]


@cache
def detuned(name):
    return fieldkit("detune", JOBS[name], "--json")


def test_there_are_three_samples_and_the_default_comes_first():
    assert len(JOBS) == 3
    assert next(iter(JOBS)) == "glycol-booster"


@pytest.mark.parametrize("name", JOBS)
def test_detune_ranks_changes_of_every_sample(name):
    ran = detuned(name)
    assert ran.status == 0, ran.err
    answer = ran.document
    assert set(answer) == {
        "state", "margin", "bands", "modes", "chance_now", "fixes", "warnings",
        "diagnosis", "diagnosis_first", "next_blows", "contradictions", "simulated", "tried",
            "other_cures",
    }  # fmt: skip
    assert set(answer["bands"][0]) == {
        "name", "low_hz", "high_hz", "avoid_low_hz", "avoid_high_hz",
    }  # fmt: skip
    assert set(answer["modes"][0]) == {
        "median_hz", "low_hz", "high_hz", "direction", "chance_clear",
    }  # fmt: skip
    assert answer["chance_now"] < 0.5
    best = answer["fixes"][0]
    assert set(best) == {
        "rank", "kind", "summary", "change", "modes_after", "nearest", "chance", "cautions",
        "install", "why", "fails", "amplification",
    }  # fmt: skip
    assert best["chance"] >= 0.9
    worst = max(e["now"]["amplification"] for e in best["amplification"] if e["now"])
    after = max(e["after"]["amplification"] for e in best["amplification"] if e["now"])
    assert after < worst
    assert best["why"]
    assert best["fails"].startswith("fails")
    assert answer["tried"] >= 10_000
    assert len(best["change"]) == 1
    assert set(best["nearest"]) == {"band", "separation"}
    assert best["cautions"]


def test_the_same_job_gives_the_same_answer_twice():
    assert fieldkit("detune", BOOSTER, "--json").document == detuned("glycol-booster").document


def test_peaks_tell_taps_modes_and_tones():
    answer = fieldkit("peaks", BOOSTER, "--json").document
    assert {"recordings", "modes", "tones", "warnings"} <= set(answer)
    tap = answer["recordings"][0]["taps"][0]
    assert set(tap) == {"at_s", "peak", "usable", "reasons"}
    mode = answer["modes"][0]
    assert {
        "frequency_hz", "frequency_sd_hz", "damping_ratio", "damping_sd", "direction", "taps",
        "strength",
    } <= set(mode)  # fmt: skip


def test_span_tells_both_states_and_the_handbook():
    answer = fieldkit("span", BOOSTER, "--json").document
    assert set(answer["states"]) == {"tapped", "running"}
    tapped = answer["states"]["tapped"]
    assert {"frequency_hz", "direction", "where"} <= set(tapped["modes"][0])
    assert {"frequency_hz", "low_hz", "high_hz", "formula", "source"} <= set(tapped["handbook"])
    assert answer["static"]["running"]["sag_mm"] > 0


def test_match_tells_pairs_and_parameters():
    answer = fieldkit("match", BOOSTER, "--json").document
    assert {"measured", "pairs", "unpaired", "parameters", "next_measurement", "warnings"} <= set(
        answer
    )
    assert {"mode", "measured_hz", "model_hz", "low_hz", "high_hz", "handbook_hz"} <= set(
        answer["pairs"][0]
    )
    assert {"name", "median", "low", "high", "unit", "informed"} <= set(answer["parameters"][0])


def test_running_names_the_order_of_the_strongest_line():
    answer = fieldkit("running", BOOSTER, "--json").document
    lines = answer["recordings"][0]["lines"]
    assert any(line["excitation"] for line in lines[:3])


@pytest.mark.parametrize("command", ["peaks", "running", "span", "match", "detune"])
def test_every_command_also_speaks_to_people(command):
    ran = fieldkit(command, BOOSTER)
    assert ran.status == 0, ran.err
    assert "Hz" in ran.out
    assert "{" not in ran.out


def test_the_advice_is_printed_where_there_is_no_terminal():
    ran = subprocess.run(
        [sys.executable, "-m", "fieldkit", str(BOOSTER)],
        capture_output=True,
        text=True,
        check=False,
        stdin=subprocess.DEVNULL,
    )
    assert ran.returncode == 0, ran.stderr
    best = detuned("glycol-booster").document["fixes"][0]
    flat = " ".join(ran.stdout.split())
    assert best["summary"] in flat
    assert f"chance {percent(best['chance'])}" in flat
    assert "local code" in flat


def test_samples_are_copied_and_never_overwrite(tmp_path):
    assert fieldkit("sample", tmp_path / "mine").status == 0
    copied = tmp_path / "mine" / "riser" / "job.toml"
    assert copied.read_bytes() == JOBS["riser"].read_bytes()
    again = fieldkit("sample", tmp_path / "mine")
    assert again.status == 2
    assert "overwritten" in again.err


def test_importing_the_core_brings_no_screen_and_no_scipy():
    """The first paint must not wait for either."""
    code = (
        "import sys, fieldkit.workup; "
        "print([n for n in ('textual', 'typer', 'scipy', 'pint', 'fluids') if n in sys.modules])"
    )
    ran = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert ran.stdout.strip() == "[]"


def test_every_command_has_help_with_an_example():
    for command in ("open", "sample", "peaks", "running", "span", "match", "detune"):
        assert "Example:" in fieldkit(command, "--help").out


def test_a_job_can_be_named_without_a_command(tmp_path):
    assert "open" in fieldkit("--help").out
    assert fieldkit(Path("nowhere.toml")).status == 2
