"""Plain text: columns line up, nothing steers a terminal."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fieldkit.sheet.plain import WIDTH, clean, paragraph, share, table, with_doubt


@given(st.text())
def test_no_control_or_formatting_character_survives(text):
    assert all(character.isprintable() for character in clean(text))


def test_ordinary_text_is_left_alone():
    assert clean("Pumpe Nr. 3, 50 °C, ± 2 %") == "Pumpe Nr. 3, 50 °C, ± 2 %"


def test_numbers_stand_to_the_right_and_words_to_the_left():
    lines = table(("what", "Hz"), [("pump", "9.5"), ("fan", "120.0")])
    assert lines == ["  what     Hz", "  pump    9.5", "  fan   120.0"]


@given(st.text(alphabet="abc def", min_size=1, max_size=400))
def test_paragraphs_keep_to_the_page(text):
    assert all(len(line) <= WIDTH for line in paragraph(text, 4, "- "))


@pytest.mark.parametrize(
    ("value", "sd", "shown"),
    [
        (53.02834, 0.00123, ("53.0283", "0.0012")),
        (53.02834, 0.00001, ("53.0283", "<0.0001")),
        (53.02834, 0.234, ("53.03", "0.23")),
        (53.02834, 12.0, ("53", "12")),
        (53.02834, 0.0, ("53.0283", "<0.0001")),
        (53.02834, None, ("53.03", "-")),
    ],
)
def test_digits_follow_the_doubt(value, sd, shown):
    assert with_doubt(value, sd) == shown


@pytest.mark.parametrize(
    ("part", "shown"), [(1.0, "1.00"), (0.25, "0.25"), (0.004, "<0.01"), (0.0, "0.00")]
)
def test_a_small_share_is_not_shown_as_nothing(part, shown):
    assert share(part) == shown
