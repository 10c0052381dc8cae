"""Modes of running recordings on their way through a job."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
import soundfile

from fieldkit import workup
from fieldkit.detune.evidence import Evidence
from fieldkit.job.document import RecordingEntry
from fieldkit.job.schema import load_job
from fieldkit.progress import Progress
from fieldkit.sheet import documents, tables
from fieldkit.signal.modes import MeasuredMode
from tests.cli.running import fieldkit
from tests.signal.made_running import machine, stirred

RISER = Path(__file__).parents[2] / "samples" / "riser" / "job.toml"
RATE_HZ = 600
TRUE = ((17.0, 0.012), (43.0, 0.01))


def recorded(folder: Path, signal: np.ndarray) -> Path:
    """A running recording in a file, a tenth of full scale."""
    path = folder / "running.wav"
    soundfile.write(path, 0.1 * signal / np.abs(signal).max(), RATE_HZ, subtype="FLOAT")
    return path


@pytest.fixture
def shaken_by_flow(tmp_path: Path) -> Path:
    """Two modes stirred by flow, beside the lines of a pump."""
    signal = stirred(TRUE, seed=3, rate_hz=RATE_HZ)
    return recorded(tmp_path, signal + machine(((24.5, 1.0), (49.0, 0.6)), len(signal), seed=4))


@pytest.fixture
def lines_only(tmp_path: Path) -> Path:
    """A pump, and nothing else."""
    count = 40 * RATE_HZ
    noise = 0.003 * np.random.default_rng(1).standard_normal(count)
    return recorded(tmp_path, machine(((24.5, 1.0), (49.0, 0.6)), count, seed=4) + noise)


def test_a_reading_holds_the_modes_with_state_direction_and_place(shaken_by_flow: Path) -> None:
    """As the entry of the job says."""
    entry = RecordingEntry(shaken_by_flow, "running", "running", direction="lateral", at_m=2.5)
    reading = workup.read_running_entry(entry, 80.0)
    assert reading.modes is not None
    assert reading.no_modes == ""
    assert [round(m.frequency_hz) for m in reading.modes.modes] == [17, 43]
    for mode in reading.modes.modes:
        assert (mode.state, mode.direction, mode.at_m) == ("running", "lateral", 2.5)
        assert (mode.source, mode.taps) == ("running", 0)


def test_the_evidence_keeps_taps_and_running_modes_apart(shaken_by_flow: Path) -> None:
    """All in rising frequency, each with its source."""
    reading = workup.read_running_entry(workup.entry_for(shaken_by_flow, "running"), 80.0)
    tap = MeasuredMode(18.1, 0.02, 0.01, 0.001, "vertical", taps=4)
    evidence = workup.with_running_modes(Evidence((tap,)), (reading,))
    assert [m.source for m in evidence.modes] == ["running", "tap", "running"]
    assert evidence.firm == (tap,)
    assert len(evidence.running) == 2


def test_lines_only_leave_a_reason_and_no_warning(lines_only: Path) -> None:
    """The reading still tells lines and level."""
    reading = workup.read_running_entry(workup.entry_for(lines_only, "running"))
    assert reading.modes is None
    assert "machine lines only" in reading.no_modes
    assert reading.picture.lines
    document = documents.running((reading,), None)
    assert document["modes"] == []
    assert "machine lines only" in document["recordings"][0]["no_modes"]
    assert not any("machine lines only" in text for text in document["warnings"])
    assert "machine lines only" in " ".join(" ".join(tables.running((reading,), None)).split())


def test_the_command_tells_the_modes(shaken_by_flow: Path) -> None:
    """In text with their doubt, in JSON under the keys of peaks."""
    text = fieldkit("running", shaken_by_flow, "--up-to", "80").out
    assert "weaker evidence than a tap" in " ".join(text.split())
    answer = fieldkit("running", shaken_by_flow, "--up-to", "80", "--json").document
    assert isinstance(answer["refused_modes"], list)
    for mode, (frequency_hz, damping) in zip(answer["modes"], TRUE, strict=True):
        assert mode["frequency_hz"] == pytest.approx(frequency_hz, abs=5 * mode["frequency_sd_hz"])
        assert mode["damping_ratio"] == pytest.approx(damping, abs=5 * mode["damping_sd"])
        assert mode["source"] == "running"


def test_running_modes_of_the_riser_are_those_of_its_truth() -> None:
    """Natural frequencies and damping ratios full and warm, as samples/truth.json has them."""
    job = load_job(RISER)
    readings = workup.running_readings(job, Progress())
    modes = [mode for reading in readings if reading.modes for mode in reading.modes.modes]
    truth = [(12.35, 0.0185), (17.41, 0.0176), (50.14, 0.0116), (54.31, 0.0083), (76.75, 0.0236)]
    for mode, (frequency_hz, damping) in zip(
        sorted(modes, key=lambda m: m.frequency_hz), truth, strict=True
    ):
        assert mode.frequency_hz == pytest.approx(frequency_hz, abs=2.6 * mode.frequency_sd_hz)
        assert mode.damping_ratio == pytest.approx(damping, abs=2.6 * (mode.damping_sd or 0))


def test_a_job_without_taps_is_matched_by_its_running_recordings() -> None:
    """Wide, and it says so."""
    job = load_job(RISER)
    untapped = replace(job, recordings=job.recordings_of("running"))
    found = workup.run(untapped)
    assert found.match is not None
    assert any("nothing was tapped" in text for text in found.match.warnings)
    assert found.detuning is not None
    assert found.evidence.firm == ()
