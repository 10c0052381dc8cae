"""Markdown of a sheet: the same texts as the page, none of them markup."""

from __future__ import annotations

import re

import pytest

from fieldkit.sheet.markdown import markdown, plain
from fieldkit.sheet.plain import clean
from tests.sheet import made_up


def unescaped(text: str) -> str:
    return re.sub(r"\\([!-/:-@\[-`{-~])", r"\1", text)


def test_every_text_of_the_sheet_is_in_it():
    sheet = made_up.document()
    said = unescaped(markdown(sheet))
    for text in made_up.texts(sheet):
        assert text in said


@pytest.mark.parametrize(
    "text",
    [
        "<b>bold</b>", "*a* _b_ `c` ~~d~~", "[a](http://x.test)", "# title", "1. item", "- item",
        "| cell |", "&amp;", "http://x.test/a", "www.x.test", "a@x.test", "> quote", "===", "$x$",
        "a\\b",
    ],
)  # fmt: skip
def test_what_would_be_markup_is_escaped_and_reads_as_written(text):
    written = plain(text)
    assert unescaped(written) == text
    bare = re.sub(r"\\[!-/:-@\[-`{-~]", "", written)
    assert not re.search(r"[<>*_`\[\]|~&$\\@]|://|www\.", bare)
    assert not re.match(r"#|\d+[.)]\s|[-+=](\s|=|$)", written)


def test_numbers_and_names_are_left_readable():
    assert plain("49.1 Hz sits on pump 2x, 2.0 % away (48.4 to 51.8)") == (
        "49.1 Hz sits on pump 2x, 2.0 % away (48.4 to 51.8)"
    )
    assert plain("-3.2 mm") == "-3.2 mm"


def test_a_hostile_job_leaves_no_markup_of_its_own():
    said = markdown(made_up.document(made_up.hostile()))
    rest = re.sub(r"\\[!-/:-@\[-`{-~]", "", said.partition("\n")[2])
    assert "<" not in rest
    assert "](" not in rest
    assert not [c for c in said if not c.isprintable() and c != "\n"]
    assert clean(made_up.HOSTILE) in unescaped(said)


def test_a_row_has_as_many_cells_as_its_head():
    said = markdown(made_up.document(made_up.hostile()))
    bare = re.sub(r"\\\|", "", said)
    for block in bare.split("\n\n"):
        rows = [line for line in block.splitlines() if line.startswith("|")]
        assert len({row.count("|") for row in rows}) <= 1
