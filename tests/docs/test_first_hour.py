"""The first hour shows what the program prints: its commands are run, its lines are found."""

from __future__ import annotations

import re
import shlex
import sys
from collections.abc import Sequence
from pathlib import Path

import pytest

from tests.cli.running import fieldkit
from tests.docs.test_documents import ROOT

PAGE = (ROOT / "docs" / "first-hour.md").read_text("utf-8")
_SHOWN = re.compile(
    r"^```sh\nfieldkit ([^\n]*)\n```\n\n```text\n(.*?)^```$", re.MULTILINE | re.DOTALL
)
_TOKEN = re.compile(r"\d+(?:\.\d+)?|[^\d\s]+")
APART = 0.2
"""How far a number may have moved: nearer work on the numbers is no reason to write again."""
SHOWN = [pytest.param(call, text, id=call.split()[0]) for call, text in _SHOWN.findall(PAGE)]


def tokens(text: str) -> list[str]:
    """Words and numbers, however the lines were folded."""
    return _TOKEN.findall(text)


def alike(shown: str, found: str) -> bool:
    """The same word, or nearly the same number."""
    try:
        a, b = float(shown), float(found)
    except ValueError:
        return shown == found
    return abs(a - b) <= APART * max(abs(a), abs(b))


def holds(found: Sequence[str], shown: Sequence[str]) -> bool:
    """Whether the shown tokens stand in what was found, one behind the other."""
    starts = range(len(found) - len(shown) + 1)
    return any(all(map(alike, shown, found[at:])) for at in starts)


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Where the reader stands: the samples beside, and the taps made after the change."""
    (tmp_path / "samples").symlink_to(ROOT / "samples", target_is_directory=True)
    monkeypatch.chdir(tmp_path)
    return tmp_path


@pytest.mark.parametrize(("call", "text"), SHOWN)
def test_every_line_shown_is_printed(call: str, text: str, folder: Path) -> None:
    """Numbers may move by a fifth; words may not."""
    if call.startswith("recheck"):
        make_after(folder / "after")
        make_after(folder / "weak", 4.0)
    ran = fieldkit(*shlex.split(call))
    assert ran.status == 0, ran.err
    found = tokens(ran.out)
    missing = [part for part in text.split("...\n") if not holds(found, tokens(part))]
    assert not missing, ran.out


def make_after(place: Path, *stiffness_mn_per_m: float) -> None:
    """The recordings as the page says they are made."""
    import runpy

    sys.path.insert(0, str(ROOT / "samples"))
    try:
        runpy.run_path(str(ROOT / "docs" / "make_retap.py"))["main"](place, *stiffness_mn_per_m)
    finally:
        sys.path.remove(str(ROOT / "samples"))


def test_the_page_shows_enough_to_be_held_to() -> None:
    assert len(SHOWN) >= 6


def test_a_number_that_moved_far_and_a_word_that_changed_are_noticed() -> None:
    """The comparison itself can fail."""
    found = tokens("1. chance 96 %: stiffen the clamp\n at 1.70 m to 14 MN/m")
    assert holds(found, tokens("chance 94 %: stiffen the clamp at 1.7 m to 13 MN/m"))
    assert not holds(found, tokens("chance 96 %: stiffen the guide at 1.70 m"))
    assert not holds(found, tokens("chance 60 %: stiffen the clamp"))
