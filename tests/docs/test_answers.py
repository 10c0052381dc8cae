"""Every key of every JSON document is told in docs/file-formats.md, under its command."""

from __future__ import annotations

import re
from collections.abc import Iterator
from typing import Any

import pytest

from fieldkit.sheet import recheck as recheck_told
from fieldkit.span.layout import State
from fieldkit.workup.rechecking import Rechecked
from fieldkit.workup.retaps import Retaps
from tests.cli.running import fieldkit
from tests.docs.test_documents import ROOT
from tests.ui import glycol
from tests.ui.test_recheck_screen import ANSWER

TEXT = (ROOT / "docs" / "file-formats.md").read_text("utf-8")
JOB = ROOT / "samples" / "small-bore" / "job.toml"
NAMES = {"tapped", "running", "vertical", "lateral", "axial"}
"""Keys that are names of states and directions."""
SHARED = {"detune": ("running", "match"), "recheck": ("detune",), "running": ("peaks",)}
"""Where a section says that something is as in another."""


def section(command: str) -> str:
    """What is told under a command's heading."""
    found = re.search(rf"^### fieldkit {command}\n(.*?)(?=^#)", TEXT + "\n#", re.M | re.S)
    assert found, command
    return found[1]


def told(command: str) -> set[str]:
    """Every key that is named there, or where it says."""
    named = set(re.findall(r"`(\w+)`", section(command)))
    return named.union(*(told(other) for other in SHARED.get(command, ())))


def on_top(command: str) -> set[str]:
    """The keys of the document itself: the first column, but for parts of one of them."""
    firsts = re.findall(r"^\| (`.*?) \|", section(command), re.M)
    return {
        key for first in firsts if " of a " not in first for key in re.findall(r"`(\w+)`", first)
    }


def keys(document: Any) -> Iterator[str]:
    """Every key at every depth."""
    if isinstance(document, dict):
        yield from document
        document = list(document.values())
    if isinstance(document, list):
        for one in document:
            yield from keys(one)


@pytest.mark.parametrize("command", ["peaks", "running", "span", "match", "detune"])
def test_every_key_is_told_and_every_key_told_is_there(command: str) -> None:
    """On a sample that gives an answer everywhere."""
    document = fieldkit(command, JOB, "--json").document
    assert not set(keys(document)) - NAMES - told(command)
    assert on_top(command) == set(document)


def test_every_key_of_a_recheck_is_told_and_every_key_told_is_there() -> None:
    """On an answer with reasons and a next change."""
    found = Rechecked(None, glycol.FIXES[0], Retaps((), ()), State("tapped"), ANSWER)  # type: ignore[arg-type]
    document = recheck_told.document(found)
    assert not set(keys(document)) - NAMES - told("recheck")
    assert on_top("recheck") == {*document, "simulated"}
