"""``fieldkit detune JOB --fix N --curve KIND``."""

from __future__ import annotations

import pytest

from fieldkit.cli.samples import sample_jobs
from tests.cli.running import fieldkit

JOB = next(path for path in sample_jobs() if path.parent.name == "small-bore")


@pytest.fixture(autouse=True)
def _few_steps(monkeypatch):
    """Seven values are enough to see that every one is told."""
    from fieldkit.detune import curves

    monkeypatch.setattr(curves.fix_curve, "__defaults__", (None, 7))


def test_a_curve_is_one_document_and_a_table():
    """As many chances and lists of modes as values; the drawn value among them."""
    answer = fieldkit("detune", JOB, "--fix", 1, "--curve", "mass", "--json")
    assert answer.status == 0, answer.err
    found = answer.document
    assert len(found["mass_kg"]) == len(found["chance"]) == len(found["modes"]) == 7
    assert found["drawn"] in found["mass_kg"]
    assert all(
        "nearest" in found and mode["low_hz"] <= mode["high_hz"] for mode in found["modes"][0]
    )
    text = fieldkit("detune", JOB, "--fix", 1, "--curve", "mass")
    assert text.status == 0, text.err
    assert "as drawn" in text.out
    assert all(len(line) <= 80 for line in text.out.splitlines()[1:])


def test_a_curve_needs_a_change_that_exists():
    answer = fieldkit("detune", JOB, "--curve", "place")
    assert answer.status == 2
    assert "--fix from 1" in answer.err
