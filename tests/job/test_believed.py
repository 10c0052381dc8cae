"""A support may say what is believed of its stiffness, and how surely."""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from fieldkit.errors import InputError
from fieldkit.job.lines import places
from fieldkit.job.schema import parse_job
from fieldkit.job.splice import set_value
from fieldkit.job.typed import rendered, text_of, value_of
from fieldkit.span.layout import Believed
from fieldkit.span.supports import springs
from fieldkit.ui.forms.codecs import Quantity
from tests.job.sample import FULL

PATH = Path("plant/job.toml")
OLD = 'vertical = "unknown"'
NEW = 'vertical = { median = "5 MN/m", spread = 2.0 }'
STIFFNESS = Quantity("stiffness", ("rigid",))


def test_a_stiffness_is_believed_within_a_factor():
    """The factor is one standard deviation of the logarithm, and stands in for the kind's own."""
    job = parse_job(FULL.replace(OLD, NEW))
    assert job.span.supports[1].vertical == Believed(5e6, math.log(2))
    (spring,) = [s for s in springs(job.span) if s.support == 1 and s.axis == "vertical"]
    assert (spring.stiffness, spring.sd_ln) == (5e6, math.log(2))


def test_a_rotation_is_believed_too():
    text = FULL.replace('rotation = "rigid"', 'rotation = {median = "20 kN m/rad", spread = 3}')
    assert parse_job(text).span.supports[1].rotation == Believed(2e4, math.log(3))


@pytest.mark.parametrize(
    ("value", "told"),
    [
        ('{ median = "5 MN/m" }', "spread is missing; write { median = "),
        ("{ spread = 2.0 }", "median is missing"),
        ('{ median = "5 MN/m", sd = 2.0 }', "'sd' is not a key of it"),
        ('{ median = "5 MN/m", spread = 1.0 }', "1.0 is not a factor above 1 and at most 100"),
        ('{ median = "5 MN/m", spread = "2" }', "'2' is not a factor above 1"),
        ('{ median = "5 MN/m", spread = nan }', "is not a factor above 1"),
        ('{ median = "0 N/m", spread = 2 }', "a median of '0 N/m' is not above zero"),
        ('{ median = "5 kg", spread = 2 }', "5 kg"),
        ('{ median = "rigid", spread = 2 }', "rigid"),
    ],
)
def test_a_belief_that_says_nothing_is_refused_at_its_line(value: str, told: str):
    text = FULL.replace(OLD, f"vertical = {value}")
    with pytest.raises(InputError) as caught:
        parse_job(text, PATH)
    line = 1 + text[: text.index("vertical = {")].count("\n")
    assert told in str(caught.value)
    place = caught.value.place
    assert (place.file, place.line, place.field) == (PATH, line, "support[1].vertical")


def test_a_form_shows_it_and_writes_it_back_unchanged():
    text = FULL.replace(OLD, NEW)
    loc = ("support", 1, "vertical")
    typed = text_of({"median": "5 MN/m", "spread": 2.0}, loc, places(text))
    assert typed == '{ median = "5 MN/m", spread = 2.0 }'
    again = set_value(FULL, loc, rendered(value_of(typed, loc)))
    assert parse_job(again).span == parse_job(text).span


def test_a_form_says_how_it_is_understood():
    said = STIFFNESS.shown({"median": "5 MN/m", "spread": 2.0}, "SI")
    assert said == "about 5.0 MN/m, a factor 2 either way"
    with pytest.raises(InputError, match="spread is missing"):
        STIFFNESS.shown({"median": "5 MN/m"}, "SI")


def test_half_a_table_typed_is_told_as_what_it_is():
    assert value_of('{ median = "5', ("support", 1, "vertical")) == '{ median = "5'
