"""Each view tells how its numbers come about."""

from __future__ import annotations

import json

import pytest

from fieldkit.sheet.how import METHODS, document, how
from tests.cli.running import fieldkit
from tests.ui.glycol import workup


@pytest.mark.parametrize("view", METHODS)
def test_every_method_of_a_view_names_its_source(view: str) -> None:
    lines = how(view)
    sources = [line for line in lines if line.startswith("  source: ")]
    named = [line for line in lines if line and line not in sources]
    assert len(sources) == len(named) > 2
    assert all(len(line) > len("  source: ") + 8 for line in sources)


def test_the_handbook_formula_of_a_job_comes_with_its_numbers() -> None:
    work = workup()
    assert work.states
    told = " ".join(how("span", work))
    for entry in work.states:
        if entry.handbook is not None:
            assert entry.handbook.formula in told
            assert entry.handbook.source in told


def test_the_command_line_tells_the_same() -> None:
    ran = fieldkit("how", "detune")
    assert ran.status == 0
    flat = " ".join(ran.out.split())
    for entry in document("detune"):
        assert entry["source"] in flat
    assert json.loads(fieldkit("how", "detune", "--json").out) == {"methods": document("detune")}
