"""Resonance or forced, severity, the next blow and contradictions, from the command line."""

from __future__ import annotations

import re
from functools import cache
from pathlib import Path

import numpy as np
import pytest
import soundfile

from fieldkit.cli.samples import sample_jobs
from tests.cli.running import Ran, fieldkit

JOBS = {path.parent.name: path for path in sample_jobs()}
BOOSTER = JOBS["glycol-booster"]
RATE_HZ = 1000


@cache
def running() -> Ran:
    """The booster's running records with its taps."""
    return fieldkit("running", BOOSTER, "--json")


def test_the_strong_line_of_the_booster_is_called_a_resonance_with_its_figures():
    """The sample is made with a mode in pump 2x; ratio and magnification fit each other."""
    first = running().document["recordings"][0]["diagnosis"][0]
    assert (first["verdict"], first["excitation"]) == ("resonance", "booster pump 2x")
    r, zeta = first["frequency_ratio"], first["mode"]["damping_ratio"]
    times = first["amplification"]
    assert r == pytest.approx(first["frequency_hz"] / first["mode"]["frequency_hz"])
    assert times["best"] == pytest.approx(1 / np.hypot(1 - r**2, 2 * zeta * r), rel=1e-6)
    assert times["low"] < times["best"] < times["high"]
    assert first["reason"].startswith("Resonance: ")
    assert first["measure_next"]


def test_a_calibrated_level_is_screened_against_every_line_with_its_source():
    """The API 618 value is 2 sqrt 2 of the line as velocity: acceleration over 2 pi f."""
    recording = running().document["recordings"][0]
    assert recording["screening_refused"] is None
    assert [one["screening"] for one in recording["screening"]] == [
        "velocity-stress",
        "ASME OM part 3 style velocity",
        "process pipework guideline",
        "ISO 20816-8 zones, dampers and piping",
        "API 618 design line",
    ]
    assert all("from memory" in one["source"] for one in recording["screening"])
    line = recording["lines"][0]
    velocity = line["rms"] / (2 * np.pi * line["frequency_hz"])
    assert recording["screening"][-1]["value"] == pytest.approx(2 * 2**0.5 * velocity, rel=1e-6)


def test_the_text_says_screening_and_who_decides():
    said = " ".join(fieldkit("running", BOOSTER).out.split())
    assert "Resonance or forced?" in said
    assert "Severity, screening only" in said
    assert "the responsible piping engineer decides under the local code" in said
    assert not re.search(r"\b(safe|acceptable)\b", said)


def recorded(folder: Path) -> Path:
    """A line at 49 Hz over noise, without any sensitivity."""
    time = np.arange(30 * RATE_HZ) / RATE_HZ
    noise = np.random.default_rng(2).standard_normal(len(time))
    path = folder / "running.wav"
    soundfile.write(path, 0.2 * np.sin(2 * np.pi * 49 * time) + 0.002 * noise, RATE_HZ)
    return path


def test_an_uncalibrated_level_is_not_screened_and_says_how_to_calibrate(tmp_path):
    ran = fieldkit("running", recorded(tmp_path), "--json")
    assert ran.status == 0, ran.err
    recording = ran.document["recordings"][0]
    assert recording["screening"] == []
    assert "not calibrated" in recording["screening_refused"]
    assert "--calibrate" in recording["screening_refused"]
    assert recording["diagnosis"] == []


def test_match_ranks_further_blows_and_the_sentence_is_the_best_of_them():
    ran = fieldkit("match", BOOSTER, "--json")
    blows = ran.document["next_blows"]
    assert blows == sorted(blows, key=lambda blow: blow["relative_sd_after"])
    for blow in blows:
        assert 0 <= blow["relative_sd_after"] <= blow["relative_sd_before"]
    sentence = ran.document["next_measurement"]
    assert f"{blows[0]['direction']} direction" in sentence
    assert isinstance(ran.document["contradictions"], list)


def test_detune_begins_with_the_verdict():
    ran = fieldkit("detune", BOOSTER, "--json")
    assert ran.document["diagnosis_first"].startswith("Resonance: ")
    verdicts = {one["verdict"] for one in ran.document["diagnosis"]}
    assert verdicts <= {"resonance", "near", "forced", "cannot tell"}
