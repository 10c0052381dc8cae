"""``fieldkit span JOB --spacing``: the contract of the answer."""

from __future__ import annotations

import pytest

from fieldkit.cli.samples import sample_jobs
from tests.cli.running import fieldkit

JOBS = {path.parent.name: path for path in sample_jobs()}
PLAIN = """
fieldkit = 1
{units}
[pipe]
size = "NPS 4"
schedule = "40"
material = "carbon steel"
[[leg]]
direction = "+x"
length = "6 m"
[[support]]
at = "0 m"
kind = "clamp"
[[support]]
at = "6 m"
kind = "clamp"
"""
FAN = """
[[excitation]]
name = "fan"
frequency = "10 Hz"
"""


@pytest.fixture
def job(tmp_path):
    def write(text):
        path = tmp_path / "job.toml"
        path.write_text(text)
        return path

    return write


def test_the_answer_without_a_tap_rests_on_what_is_usual(job):
    ran = fieldkit("span", job(PLAIN.format(units="") + FAN), "--spacing", "--json")
    assert ran.status == 0, ran.err
    found = ran.document["spacing"]
    assert set(found) == {
        "state",
        "spans",
        "supports",
        "clear_above_hz",
        "chosen_m",
        "above_m",
        "above_with_soft_supports_m",
        "above_with_rigid_supports_m",
        "between_bands_m",
        "by_spans",
        "weight_based",
        "curve",
    }
    assert found["clear_above_hz"] == pytest.approx(12.0)
    assert found["supports"]["source"] == "prior"
    assert [entry["spans"] for entry in found["by_spans"]] == list(range(2, 11))
    first = [point for point in found["curve"] if point["spacing_m"] <= found["chosen_m"]]
    assert all(point["frequency_hz"] >= 12.0 for point in first)
    assert found["weight_based"]["this_line_m"] == pytest.approx(17 * 0.3048)
    assert any("measured" in text for text in ran.document["warnings"])


def test_a_tap_tells_how_stiff_the_supports_are():
    ran = fieldkit("span", JOBS["glycol-booster"], "--spacing", "--json")
    assert ran.status == 0, ran.err
    assert ran.document["spacing"]["supports"]["source"] == "tap"


def test_text_names_the_spacing_and_fits_the_page(job):
    ran = fieldkit("span", job(PLAIN.format(units='units = "US"') + FAN), "--spacing")
    assert ran.status == 0, ran.err
    assert "A support every" in ran.out
    assert "◀ chosen" in ran.out
    assert "responsible piping engineer" in " ".join(ran.out.split())
    assert max(map(len, ran.out.splitlines())) <= 80


def test_without_excitation_there_is_a_curve_and_no_choice(job):
    ran = fieldkit("span", job(PLAIN.format(units="")), "--spacing", "--json")
    assert ran.status == 0, ran.err
    assert ran.document["spacing"]["chosen_m"] is None
    assert len(ran.document["spacing"]["curve"]) > 20


@pytest.mark.parametrize(
    ("words", "says"),
    [(("--support", "nozzle"), "use one of clamp"), (("--spans", "1"), "")],
)
def test_bad_choices_are_refused(job, words, says):
    ran = fieldkit("span", job(PLAIN.format(units="") + FAN), "--spacing", *words)
    assert ran.status == 2
    assert says in ran.err
