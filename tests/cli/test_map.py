"""``fieldkit detune JOB --map``."""

from __future__ import annotations

import pytest

from fieldkit.cli.samples import sample_jobs
from tests.cli.running import fieldkit

JOB = next(path for path in sample_jobs() if path.parent.name == "small-bore")


@pytest.mark.parametrize("kind", ["support", "mass"])
def test_the_map_is_one_document(kind):
    """One list of chances per station, one value per size, and words for each."""
    answer = fieldkit("detune", JOB, "--map", kind, "--json")
    assert answer.status == 0, answer.err
    found = answer.document
    sizes = found["stiffness_n_per_m" if kind == "support" else "mass_kg"]
    assert len(found["chance"]) == len(found["station_m"]) == len(found["words"])
    assert all(len(column) == len(sizes) for column in found["chance"])
    assert found["best"]["words"]
    assert {"add_support", "add_mass"} & set(found["best"]["change"])


def test_the_map_is_a_picture_too():
    answer = fieldkit("detune", JOB, "--map", "support", "--holds", "vertical")
    assert answer.status == 0, answer.err
    assert " ┤" in answer.out
    assert all(len(line) <= 80 for line in answer.out.splitlines())


def test_an_unknown_map_is_bad_input():
    assert fieldkit("detune", JOB, "--map", "prayers").status == 2
