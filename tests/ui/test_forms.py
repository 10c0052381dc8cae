"""Fields of the forms: what people type, what is understood, what goes into the file."""

from __future__ import annotations

import pytest

from fieldkit.job.file_model import keys_of
from fieldkit.job.store import JobText, new_job_text
from fieldkit.span.supports import KINDS
from fieldkit.ui.forms import FORMS, rows_of, texts_of, with_values
from fieldkit.ui.forms.codecs import checked
from fieldkit.ui.forms.tables import SUPPORT_KINDS
from tests.ui.job_text import JOB_TEXT


def judged(table: str, key: str, typed: str, units: str = "SI") -> tuple[str, str]:
    """(as understood, error) of a text typed into a field."""
    form = FORMS[table]
    return checked(form.field(key).codec, form.place(key), typed, units)


@pytest.mark.parametrize(
    ("table", "key", "typed", "understood"),
    [
        ("leg", "length", " 4200 mm ", "4.2 m"),
        ("leg", "length", "4.2", "4.2 m"),
        ("leg", "direction", "-z", "down"),
        ("leg", "direction", "1, 0, 0.5", "sloping"),
        ("support", "vertical", "11000 lbf/in", "1.93 MN/m"),
        ("support", "vertical", "rigid", "rigid"),
        ("support", "rotation", "unknown", "unknown"),
        ("mass", "tolerance", "15 %", "0.15"),
        ("mass", "offset", "0, 0, 0.18 m", "0 m, 0 m, 180 mm"),
        ("excitation", "speed", "1480 rpm", "1480 rpm"),
        ("excitation", "speed", "1450 to 1495 rpm", "1450 rpm to 1495 rpm"),
        ("excitation", "orders", "1, 2,6", "1, 2, 6"),
        ("state.running", "fill", "0 to 1", "0 to 1"),
        ("goal", "keep_out", "1 m to 1.6 m; 3 to 4 m", "1.0 m to 1.6 m; 3.0 m to 4.0 m"),
        ("recording", "channel", "2", "2"),
    ],
)
def test_what_is_typed_is_shown_as_it_is_understood(
    table: str, key: str, typed: str, understood: str
) -> None:
    assert judged(table, key, typed) == (understood, "")


def test_the_understood_value_is_in_the_units_of_the_job() -> None:
    assert judged("leg", "length", "4.1148 m", "US") == ("13 ft 6.0 in", "")


@pytest.mark.parametrize(
    ("table", "key", "typed", "sentence"),
    [
        ("leg", "length", "4 kg", "'4 kg' is not a length that can be read"),
        ("leg", "length", "1 m to 2 m", "is not a length"),
        ("leg", "direction", "north", "'north' is not a direction"),
        ("leg", "direction", "1, 0", "is not a direction"),
        ("support", "kind", "magnet", "write one of anchor, nozzle, clamp"),
        ("support", "vertical", "2", "bare"),
        ("mass", "mass", "-3 kg", "a mass cannot be negative"),
        ("mass", "tolerance", "15", "15 does not fit here; write a number from 0 to 1"),
        ("mass", "offset", "0 m, 1 m", "2 values where 3 belong"),
        ("excitation", "speed", "1480", "bare"),
        ("excitation", "speed", "1 to 2 to 3 rpm", "3 values where one or two belong"),
        ("recording", "channel", "1.5", "write a whole number"),
    ],
)
def test_what_means_nothing_gets_one_sentence(
    table: str, key: str, typed: str, sentence: str
) -> None:
    understood, error = judged(table, key, typed)
    assert understood == ""
    assert sentence in error
    assert "\n" not in error


def test_every_field_of_every_form_is_a_key_of_the_job_file() -> None:
    """A form cannot offer what the file would refuse."""
    for form in FORMS.values():
        table = tuple(part for part in form.table.split(".") if part)
        for field in form.fields:
            *inner, key = field.key.split(".")
            assert key in keys_of((*table, *inner)), f"{form.table}: {field.key}"


def test_the_forms_offer_every_kind_of_support() -> None:
    assert set(SUPPORT_KINDS) == set(KINDS)


TEXT = JobText(JOB_TEXT)


def test_every_row_of_the_description_is_listed_as_it_was_typed() -> None:
    listed = {row.label: row.value for row in rows_of(TEXT)}
    assert listed["Support 2"] == "at 3.4 m, clamp, vertical unknown, lateral 2 MN/m"
    assert listed["Leg 1"] == "+x, 4.2 m"
    assert listed["Mass 1"] == "check valve, at 2.0 m, 24 kg"
    assert listed["Excitation 1"] == "pump, 1450 rpm to 1495 rpm, orders 1, 2, 6"
    assert listed["Running"] == "fill 1.0, temperature 65 degC, pressure 6 bar"
    assert listed["Goal"] == "as usual"


def test_an_edited_value_goes_into_the_text_and_leaves_comments_alone() -> None:
    after = with_values(TEXT, FORMS["support"], 1, {"vertical": "3 MN/m", "lateral": ""})
    assert after.job().span.supports[1].vertical == 3e6
    assert after.job().span.supports[1].lateral == "implied"
    assert "# nobody has seen the steel behind it" in after.text


def test_a_new_row_and_a_nested_key_hold_what_was_typed() -> None:
    after = with_values(TEXT, FORMS["mass"], -1, {"at": "1 m", "mass": "5 kg", "name": ""})
    assert after.job().span.masses[-1].mass_kg == 5.0
    wrapped = {"insulation.thickness": "50 mm", "insulation.density": "130 kg/m^3"}
    after = with_values(TEXT, FORMS["pipe"], None, wrapped)
    assert after.job().span.insulation is not None
    assert after.job().span.insulation.thickness_m == pytest.approx(0.05)


def test_a_form_starts_with_what_stands_in_the_file() -> None:
    for row in rows_of(TEXT):
        form = FORMS[row.table]
        for key, text in texts_of(TEXT, form, row.index).items():
            if any(field.key == key for field in form.fields):
                codec = form.field(key).codec
                assert checked(codec, form.place(key), text, "SI")[1] == ""


def test_a_new_job_holds_together_and_lists_its_rows() -> None:
    assert new_job_text().job().span.length_m == 4.0
    assert len(rows_of(new_job_text())) > 6
