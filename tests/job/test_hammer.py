"""The hammer's channel of a tap recording: read, refused at its key, edited and saved."""

from __future__ import annotations

from pathlib import Path

import pytest

from fieldkit.errors import InputError
from fieldkit.job.document import HammerEntry
from fieldkit.job.schema import load_job, parse_job
from fieldkit.job.store import JobText
from fieldkit.ui.forms.rows import texts_of, with_values
from fieldkit.ui.forms.tables import FORMS
from tests.job.sample import FULL

FORM = FORMS["recording"]
NEWTONS_PER_LBF = 4.4482216152605
"""0.45359237 kg under 9.80665 m/s^2: exact by definition (international yard and pound agreement,
1959; 3rd CGPM, 1901)."""


def struck(hammer: str, text: str = FULL) -> str:
    """The job with a hammer in its recording."""
    return text.replace("channel = 1\n", f"channel = 1\nhammer = {hammer}\n")


@pytest.mark.parametrize(
    ("hammer", "expected"),
    [
        ("{ channel = 2 }", HammerEntry(2)),
        ('{ channel = 2, at = "1.9 m" }', HammerEntry(2, None, 1.9)),
        ('{ channel = 2, scale = "434 N per unit" }', HammerEntry(2, 434.0)),
        ('{ channel = 2, scale = "2 kN/unit" }', HammerEntry(2, 2000.0)),
        ('{ channel = 3, sensitivity = "2.3 mV/N", full_scale = "1.4 V" }',
         HammerEntry(3, pytest.approx(1.4 / 2.3e-3))),
        ('{ channel = 2, sensitivity = "10 mV/lbf", full_scale = "1 V" }',
         HammerEntry(2, pytest.approx(100 * NEWTONS_PER_LBF))),
        ('{ channel = 2, sensitivity = "10 mV/lb", full_scale = "1 V" }',
         HammerEntry(2, pytest.approx(100 * NEWTONS_PER_LBF))),
        ('{ channel = 2, sensitivity = "2.3 mV/N" }', HammerEntry(2)),
    ],
)  # fmt: skip
def test_a_hammer_is_read_with_its_calibration(hammer: str, expected: HammerEntry) -> None:
    """Newtons per unit of sample, from a scale or from sensitivity and full scale."""
    assert parse_job(struck(hammer)).recordings[0].hammer == expected


def test_a_text_recording_in_volts_needs_no_full_scale() -> None:
    """A column of volts is calibrated by the sensitivity alone."""
    text = struck('{ channel = 2, sensitivity = "2.5 mV/N" }', FULL.replace(".flac", ".csv"))
    assert parse_job(text).recordings[0].hammer == HammerEntry(2, pytest.approx(400.0))


def test_a_recording_without_a_hammer_has_none() -> None:
    assert parse_job(FULL).recordings[0].hammer is None


@pytest.mark.parametrize(
    ("hammer", "field", "sentence"),
    [
        ("{}", "recording[0].hammer.channel", "channel is missing; write channel = 2"),
        ("2", "recording[0].hammer", "2 is not a table"),
        ("{ channel = 0 }", "recording[0].hammer.channel", "0 is not a whole number from 1"),
        ("{ channel = 1 }", "recording[0].hammer.channel",
         "channel 1 cannot be both the hammer and the sensor; write the channel that the hammer"),
        ('{ channel = 2, at = "9 m" }', "recording[0].hammer.at", "beyond the end of the span"),
        ('{ channel = 2, at = "-1 m" }', "recording[0].hammer.at", "a length cannot be negative"),
        ('{ channel = 2, sensitivty = "2 mV/N" }', "recording[0].hammer.sensitivty",
         "'sensitivty' is not a key of [recording.hammer]; did you mean sensitivity?"),
        ('{ channel = 2, sensitivity = "100 mV/g", full_scale = "1 V" }',
         "recording[0].hammer.sensitivity", "'mV/g' is the unit of a sensitivity to acceleration"),
        ('{ channel = 2, sensitivity = 2.3, full_scale = "1 V" }',
         "recording[0].hammer.sensitivity", "a bare 2.3 leaves its unit open; write '2.3 mV/N'"),
        ('{ channel = 2, scale = "9.81 m/s^2 per unit" }', "recording[0].hammer.scale",
         "'m/s^2' is the unit of an acceleration, not of a force"),
        ('{ channel = 2, scale = "0 N per unit" }', "recording[0].hammer.scale", "not above zero"),
        ('{ channel = 2, scale = "434 N per unit", full_scale = "1 V" }',
         "recording[0].hammer.scale", "it has both a scale and a sensitivity"),
        ('{ channel = 2, full_scale = "1 V" }', "recording[0].hammer.full_scale",
         'it has full_scale without sensitivity; write sensitivity = "2.3 mV/N" beside it'),
        ('{ channel = 2, full_scale = "0 V", sensitivity = "2 mV/N" }',
         "recording[0].hammer.full_scale", "'0 V' is not above zero"),
    ],
)  # fmt: skip
def test_a_wrong_hammer_is_told_with_its_line(hammer: str, field: str, sentence: str) -> None:
    text = struck(hammer)
    with pytest.raises(InputError) as caught:
        parse_job(text, Path("plant/job.toml"))
    line = text[: text.index("hammer =")].count("\n") + 1
    assert str(caught.value).startswith(f"plant/job.toml, line {line}, {field}: ")
    assert sentence in str(caught.value)


def test_a_running_recording_has_no_hammer() -> None:
    text = struck("{ channel = 2 }").replace('kind = "tap"', 'kind = "running"')
    with pytest.raises(InputError, match="a hammer belongs to a tap recording"):
        parse_job(text)


def test_a_hammer_in_a_table_of_its_own_is_the_same() -> None:
    """TOML's other spelling, as some editors write it."""
    text = FULL.replace(
        'at = "1.9 m"\n', 'at = "1.9 m"\n[recording.hammer]\nchannel = 2\nat = "1 m"\n'
    )
    assert parse_job(text).recordings[0].hammer == HammerEntry(2, None, 1.0)


def test_a_hammer_is_added_changed_and_taken_out_by_its_form(tmp_path: Path) -> None:
    """Key by key as it is typed, and back to the text it came from."""
    text = JobText(FULL)
    typed = {"hammer.channel": "2", "hammer.sensitivity": "2.3 mV/N", "hammer.full_scale": "1.4 V"}
    added = with_values(text, FORM, 0, typed)
    expected = HammerEntry(2, pytest.approx(1.4 / 2.3e-3))
    assert added.job().recordings[0].hammer == expected
    assert {key: texts_of(added, FORM, 0)[key] for key in typed} == typed
    saved = added.save(tmp_path / "job.toml")
    assert load_job(tmp_path / "job.toml").recordings[0].hammer == expected
    moved = with_values(saved, FORM, 0, {"hammer.at": "1.2 m", "hammer.full_scale": "2 V"})
    assert moved.job().recordings[0].hammer == HammerEntry(2, pytest.approx(2 / 2.3e-3), 1.2)
    assert with_values(added, FORM, 0, dict.fromkeys(typed, "")).text == FULL


def test_a_new_recording_may_have_a_hammer() -> None:
    """Dotted keys of a new entry go into its inner table."""
    values = {"file": "b.flac", "kind": "tap", "hammer.channel": "2", "hammer.at": "1 m"}
    added = with_values(JobText(FULL), FORM, -1, values)
    assert added.job().recordings[1].hammer == HammerEntry(2, None, 1.0)
    assert "hammer = { channel = 2, at = " in added.text
