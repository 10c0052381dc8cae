"""The page: everything of the sheet is in it, nothing is fetched, no text is markup."""

from __future__ import annotations

import re
from dataclasses import replace
from html.parser import HTMLParser
from xml.etree import ElementTree

import pytest

from fieldkit.sheet.content import Figure
from fieldkit.sheet.html import MARK, html
from fieldkit.sheet.plain import clean
from fieldkit.workup import Workup
from tests.sheet import made_up


class Read(HTMLParser):
    """What a browser would make of a page: elements with attributes, and text."""

    def __init__(self, page: str) -> None:
        super().__init__(convert_charrefs=True)
        self.elements: list[tuple[str, dict[str, str | None]]] = []
        self.text: list[str] = []
        self.feed(page)
        self.close()

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.elements.append((tag, dict(attrs)))

    def handle_data(self, data: str) -> None:
        self.text.append(data)

    @property
    def tags(self) -> set[str]:
        return {tag for tag, _ in self.elements}


def figures(work: Workup) -> list[Figure]:
    blocks = [block for part in made_up.document(work).sections for block in part.blocks]
    return [block for block in blocks if isinstance(block, Figure)]


def test_every_text_of_the_sheet_is_in_the_page():
    sheet = made_up.document()
    shown = " ".join(" ".join(Read(html(sheet)).text).split())
    for text in made_up.texts(sheet):
        assert " ".join(text.split()) in shown


def test_the_same_sheet_gives_the_same_page_twice():
    assert html(made_up.document()) == html(made_up.document())


def test_nothing_is_fetched_and_nothing_runs():
    read = Read(html(made_up.document()))
    assert "script" not in read.tags
    for _, attributes in read.elements:
        assert not any(name.startswith("on") for name in attributes)
        for name in ("src", "href", "xlink:href", "action", "data", "srcset"):
            value = attributes.get(name) or ""
            assert value.startswith(("#", "data:")) or not value
    page = html(made_up.document())
    assert "@import" not in page
    assert not re.search(r"url\((?!#|'#|\"#)", page)


@pytest.mark.parametrize("kind", ["hostile", "harmless"])
def test_a_hostile_job_adds_no_element_and_no_control_character(kind):
    """The set of elements and attributes is that of a harmless job."""
    work = made_up.hostile() if kind == "hostile" else made_up.work()
    page = html(made_up.document(work))
    harmless = Read(html(made_up.document()))
    read = Read(page)
    assert read.tags <= harmless.tags
    known = {name for _, attributes in harmless.elements for name in attributes}
    assert {name for _, attributes in read.elements for name in attributes} <= known
    assert not [c for c in page if not c.isprintable() and c != "\n"]


def test_a_hostile_title_reads_as_it_was_written():
    read = Read(html(made_up.document(made_up.hostile())))
    assert clean(made_up.HOSTILE) in read.text


def test_figures_are_well_formed_and_hold_hostile_names_as_text():
    drawn = figures(made_up.hostile())
    assert len(drawn) >= 4
    allowed = {"svg", "g", "path", "defs", "use", "text", "tspan", "clipPath", "rect", "style"}
    said = ""
    for figure in drawn:
        root = ElementTree.fromstring(figure.svg)
        assert {element.tag.rpartition("}")[2] for element in root.iter()} <= allowed
        said += "".join(root.itertext())
    assert "<script>alert(1)</script>" in said
    assert "$\\frac{1}{0}$" in said
    assert "#010101" in said


def test_figures_take_their_colours_from_the_page_and_have_ids_of_their_own():
    drawn = figures(made_up.work())
    ids = [set(re.findall(r'id="([^"]+)"', figure.svg)) for figure in drawn]
    assert sum(map(len, ids)) == len(set().union(*ids))
    for figure in drawn:
        styles = "; ".join(re.findall(r'style="([^"]*)"', figure.svg))
        colours = re.findall(r"(?:fill|stroke): ([^;]+)", styles)
        assert {c.split("(")[0] for c in colours} <= {"var", "none", "url"}


def test_missing_parts_say_in_a_sentence_what_to_do():
    bare = Workup(made_up.job(recordings=(), measured=()), (), made_up.work().evidence, (), None,
                  None)  # fmt: skip
    sheet = made_up.document(replace(bare, evidence=replace(bare.evidence, modes=())))
    assert [part.title for part in sheet.sections if not part.blocks] == []
    said = " ".join(made_up.texts(sheet))
    for sentence in ("No recording belongs to this job", "No tap recording was read",
                     "No running recording was read", "Nothing was matched"):  # fmt: skip
        assert sentence in said


def test_the_mark_of_a_sheet_stands_in_its_first_lines():
    assert MARK in html(made_up.document())[:400]


def test_simulated_recordings_are_marked_on_top_and_in_their_table():
    work = replace(made_up.work(), simulated=("tap-1.flac",))
    sheet = made_up.document(work)
    assert sheet.notices[0].startswith("SIMULATED")
    assert "tap-1.flac (SIMULATED)" in made_up.texts(sheet)
