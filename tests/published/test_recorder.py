"""The page of values: what is compared comes into it as it was, and no check ends differently."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from tests.published.page import section
from tests.published.recorder import Check, Comparison, Document, watched_approx

AGREE = (
    (2.0, 2.0, {}),
    ([1.0, 2.0], (1.0, 2.0 + 1e-9), {}),
    (np.array([3.0, 4.0]), np.array([3.0, 4.0]), {"rel": 1e-3}),
    ({"a": 1.0}, {"a": 1.01}, {"rel": 0.1}),
)
DIFFER = ((2.0, 2.1, {}), ([1.0, 2.0], (1.0, 2.1), {"rel": 1e-2}), (0.0, 0.2, {"abs": 0.1}))


@pytest.mark.parametrize(("expected", "found", "tolerances"), AGREE + DIFFER)
def test_watched_comparison_ends_as_a_plain_one(expected, found, tolerances):
    """Whatever is compared, and from both sides of the sign."""
    plain = found == pytest.approx(expected, **tolerances)
    told = []
    with watched_approx(told.append):
        assert (found == pytest.approx(expected, **tolerances)) == plain
        assert (pytest.approx(expected, **tolerances) == found) == plain
    assert len(told) == 2
    assert told[0] == told[1]
    assert (told[0].difference <= told[0].allowed) == plain


def test_texts_and_missing_numbers_are_not_told():
    """Only finite numbers make a row."""
    told = []
    with watched_approx(told.append):
        assert pytest.approx([None]) == [None]
        assert float("inf") == pytest.approx(float("inf"))
    assert not told


def test_difference_is_the_largest_in_the_row():
    """0.3 of 10 is 3 %, more than 0.01 of 1; where zero is stated, relative to the largest."""
    assert Comparison((1.0, 10.0), (1.01, 10.3), None, None).difference == pytest.approx(0.03)
    assert Comparison((0.0, 10.0), (0.1, 10.0), None, 0.2).difference == pytest.approx(0.01)


def test_section_shows_source_value_and_difference():
    """A file of checks with one number and one property."""
    numbers = Check(
        "test_one_thing", "As *printed*.", [("a|b", Comparison((2.0,), (2.02,), 0.1, None))]
    )
    numbers.outcomes.append("passed")
    known = Check("test_another", "It holds.", outcomes=["skipped"], reasons={"bank is absent"})
    checks = {check.name: check for check in (numbers, known)}
    text = "\n".join(section(Document(Path("tests/x.py"), "Title.\n\nSource 1990.", checks)))
    assert "## Title\n" in text
    assert "Source 1990." in text
    assert "| a/b | 2 | 2.02 | 1 % | 10 % |" in text
    assert r"**One thing.** As \*printed\*. *passed*" in text
    assert "*skipped; bank is absent*" in text
