"""``fieldkit peaks`` on jobs whose recordings have a hammer channel."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from tests.cli.running import fieldkit
from tests.job.sample import FULL
from tests.signal.made_blows import HalfSine, accelerance
from tests.workup.struck_pipe import BLOWS, MODES, write

RECORDING = """\
[[recording]]
file = "tap.wav"
kind = "tap"
scale = "50 m/s^2 per unit"
direction = "vertical"
at = "1.9 m"
"""
HAMMER = 'hammer = { channel = 2, scale = "434 N per unit", at = "1.9 m" }\n'
PLAIN = FULL[: FULL.index("[[recording]]")] + FULL[FULL.index("[goal]") :]


def job(folder: Path, recordings: str) -> Path:
    path = folder / "job.toml"
    path.write_text(PLAIN.replace("[goal]", f"{recordings}[goal]"), encoding="utf-8")
    return path


@pytest.fixture(scope="module")
def struck(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Three blows at the sensor, both channels calibrated."""
    folder = tmp_path_factory.mktemp("struck")
    write(folder / "tap.wav")
    return job(folder, RECORDING + HAMMER)


def test_json_holds_the_response_of_each_recording(struck: Path) -> None:
    ran = fieldkit("peaks", struck, "--json")
    assert ran.status == 0, ran.err
    response = ran.document["recordings"][0]["response"]
    assert set(response) == {
        "quantity", "unit", "calibrated", "blows", "point", "usable_to_hz", "modes", "notes",
    }  # fmt: skip
    assert response["unit"] == "(m/s^2)/N"
    assert response["point"] == "driving"
    assert response["usable_to_hz"] == pytest.approx(326, rel=0.03)
    first, second = response["modes"]
    assert set(first) == {
        "frequency_hz", "damping_ratio", "coherence", "magnitude", "effective_mass_kg",
        "effective_mass_sd_kg",
    }  # fmt: skip
    assert first["coherence"] > 0.999
    assert first["magnitude"] == pytest.approx(1 / 40 / (2 * 0.012), rel=0.02)
    assert second["effective_mass_kg"] == pytest.approx(25, rel=0.01)


def test_people_get_a_short_section(struck: Path) -> None:
    out = fieldkit("peaks", struck).out
    assert "Frequency response of tap.wav: accelerance in (m/s^2)/N, 3 blows" in out
    assert "struck at\nthe sensor, force usable to 326 Hz" in out
    assert "effective mass" in out
    assert max(map(len, out.splitlines())) <= 80


def test_us_jobs_weigh_in_pounds(struck: Path, tmp_path: Path) -> None:
    text = struck.read_text(encoding="utf-8").replace('units = "SI"', 'units = "US"')
    text = text.replace('"tap.wav"', f'"{struck.parent / "tap.wav"}"')
    (tmp_path / "job.toml").write_text(text, encoding="utf-8")
    assert "88.1 lb" in fieldkit("peaks", tmp_path / "job.toml").out


def test_the_response_is_written_with_its_units(struck: Path, tmp_path: Path) -> None:
    """Columns as in the head, values as in the closed form."""
    target = tmp_path / "response.csv"
    ran = fieldkit("peaks", struck, "--json", "--response", target)
    assert ran.status == 0, ran.err
    assert ran.document["recordings"][0]["response"]["file"] == str(target)
    with target.open(encoding="utf-8") as file:
        head, *rows = csv.reader(file)
    assert head == [
        "frequency [Hz]",
        "accelerance H1 real [(m/s^2)/N]", "accelerance H1 imaginary [(m/s^2)/N]",
        "accelerance H2 real [(m/s^2)/N]", "accelerance H2 imaginary [(m/s^2)/N]",
        "coherence [1]",
        "accelerance fitted real [(m/s^2)/N]", "accelerance fitted imaginary [(m/s^2)/N]",
    ]  # fmt: skip
    columns = np.array(rows, float).T
    assert 199 < columns[0][-1] <= 200
    near = (columns[0] > 15) & (columns[0] < 100)
    exact = accelerance(MODES, columns[0][near])
    for real, imaginary in ((1, 2), (3, 4), (6, 7)):
        found = columns[real][near] + 1j * columns[imaginary][near]
        assert np.median(np.abs(found / exact - 1)) < 0.02


def test_several_responses_go_into_numbered_files(tmp_path: Path) -> None:
    """The number is that of the recording; one without a hammer has none."""
    for name in ("tap.wav", "b.wav", "c.wav"):
        write(tmp_path / name, BLOWS[:2])
    second = RECORDING.replace("tap.wav", "b.wav").replace('at = "1.9 m"', 'at = "2.5 m"')
    third = RECORDING.replace("tap.wav", "c.wav") + "hammer = { channel = 2 }\n"
    path = job(tmp_path, RECORDING + HAMMER + second + third)
    ran = fieldkit("peaks", path, "--response", tmp_path / "out.csv")
    assert ran.status == 0, ran.err
    assert sorted(p.name for p in tmp_path.glob("out*")) == ["out-1.csv", "out-3.csv"]
    assert f"Written to {tmp_path / 'out-3.csv'}" in ran.out
    head = (tmp_path / "out-3.csv").read_text(encoding="utf-8").partition("\n")[0]
    assert "accelerance H1 real [relative]" in head
    assert "in relative units, uncalibrated" in ran.out
    recordings = fieldkit("peaks", path, "--json").document["recordings"]
    assert ["response" in recording for recording in recordings] == [True, False, True]


def test_one_blow_has_no_column_of_coherence(tmp_path: Path) -> None:
    write(tmp_path / "tap.wav", BLOWS[:1])
    ran = fieldkit("peaks", job(tmp_path, RECORDING + HAMMER), "--response", tmp_path / "r.csv")
    assert "coherence needs two or more" in ran.out
    assert "coherence [1]" not in (tmp_path / "r.csv").read_text(encoding="utf-8")


def test_a_double_hit_is_refused_with_its_dips(tmp_path: Path) -> None:
    faint = HalfSine(BLOWS[1].at_s + 0.0126, 0.12 * BLOWS[1].peak_n, 0.006)
    write(tmp_path / "tap.wav", (*BLOWS, faint))
    tap = fieldkit("peaks", job(tmp_path, RECORDING + HAMMER), "--json").document["recordings"][0][
        "taps"
    ][1]
    assert not tap["usable"]
    assert "its force has dips at" in tap["reasons"][0]


def test_without_a_hammer_there_is_nothing_to_write(struck: Path, tmp_path: Path) -> None:
    write(tmp_path / "tap.wav", BLOWS[:2])
    target = tmp_path / "out.csv"
    ran = fieldkit("peaks", tmp_path / "tap.wav", "--response", target)
    assert ran.status == 2
    assert "none of these recordings has a hammer channel" in ran.err
    assert not target.exists()


def test_a_silent_hammer_is_told_and_written_nowhere(tmp_path: Path) -> None:
    write(tmp_path / "tap.wav", BLOWS[:2], force_sign=0.0)
    path = job(tmp_path, RECORDING + HAMMER)
    recording = fieldkit("peaks", path, "--json").document["recordings"][0]
    assert recording["response"] == {
        "refused": "channel 2 shows no force at the blows; check the hammer's cable and supply, "
        "and which channel it is plugged into"
    }
    assert "no frequency response: channel 2 shows no force" in fieldkit("peaks", path).out
    ran = fieldkit("peaks", path, "--response", tmp_path / "out.csv")
    assert ran.status == 2
    assert "tap.wav has no frequency response" in ran.err


def test_what_is_read_is_never_written_over(struck: Path) -> None:
    before = struck.read_bytes()
    for target in (struck, struck.parent / "tap.wav"):
        ran = fieldkit("peaks", struck, "--response", target)
        assert ran.status == 2
        assert "this file is read here, and would be lost" in ran.err
    assert struck.read_bytes() == before


def test_a_folder_that_is_not_there_is_told(struck: Path, tmp_path: Path) -> None:
    ran = fieldkit("peaks", struck, "--response", tmp_path / "none" / "out.csv")
    assert ran.status == 2
    assert "it cannot be written (no such file or directory)" in ran.err


def test_a_missing_hammer_channel_is_bad_input(struck: Path, tmp_path: Path) -> None:
    write(tmp_path / "tap.wav", BLOWS[:1])
    ran = fieldkit("peaks", job(tmp_path, RECORDING + "hammer = { channel = 7 }\n"))
    assert ran.status == 2
    assert "its hammer is said to be on channel 7: there is no channel 7" in ran.err
