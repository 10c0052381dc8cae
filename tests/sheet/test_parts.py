"""Parts of the sheet that work something out: hashes, decays, labels, what is told in full."""

from __future__ import annotations

import hashlib
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from fieldkit.errors import InputError
from fieldkit.job.schema import load_job
from fieldkit.sheet.basis import basis_of
from fieldkit.sheet.beyond import DETAILED, detailed
from fieldkit.sheet.content import Table
from fieldkit.sheet.figure_spectra import envelope_of
from fieldkit.sheet.label_room import Box, Wish, places
from fieldkit.sheet.part_measured import recordings
from fieldkit.sheet.writing import check_target, usual_path
from tests.sheet import made_up
from tests.sheet.test_bundle import job_with


def test_inputs_are_hashed_and_an_edit_that_was_not_saved_is_said(tmp_path: Path):
    path = job_with(tmp_path, "tap.flac")
    job = load_job(path)
    stored = basis_of(job)
    assert stored.job.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()
    assert [one.sha256 for one in stored.inputs[1:]] == [hashlib.sha256(b"tap.flac").hexdigest()]
    edited = basis_of(job, path.read_text(encoding="utf-8") + "# later\n")
    assert edited.job.sha256 != stored.job.sha256
    assert "not saved" in edited.job_date
    (tmp_path / "tap.flac").unlink()
    assert basis_of(job).inputs[1].sha256 == ""


def test_the_envelope_of_a_decay_is_the_line_that_its_damping_draws():
    """A second mode a tenth away does not bend it."""
    rate_hz, f, zeta = 2000.0, 40.0, 0.01
    time_s = np.arange(int(3 * rate_hz)) / rate_hz
    rate = 2 * np.pi * f * zeta
    samples = np.exp(-rate * time_s) * np.sin(2 * np.pi * f * time_s)
    samples += 0.7 * np.exp(-1.4 * rate * time_s) * np.sin(2 * np.pi * 1.1 * f * time_s)
    at_s, envelope = envelope_of(samples, rate_hz, f, 0.3 * 0.1 * f, rate)
    inside = at_s < 1.2
    expected = np.exp(-rate * at_s[inside])
    np.testing.assert_allclose(envelope[inside], expected, rtol=0.02)


def test_labels_keep_off_the_line_each_other_and_the_edge():
    line = np.column_stack([np.linspace(20, 380, 200), np.full(200, 60.0)])
    across = np.array([0.0, 1.0])
    wishes = [
        Wish("S1, 0 m", np.array([x, 60.0]), across, off) for x in (20, 60, 75, 90, 380)
        for off in (15.0, -15.0)
    ]  # fmt: skip
    page = Box(0, 400, 0, 120)
    found = places(wishes, line, 4.0, page)
    boxes = []
    for wish, place in zip(wishes, found, strict=True):
        x, y = wish.at + place.offset
        width = 4.6 * len(wish.text)
        left = x - {"left": 0, "center": width / 2, "right": width}[place.side]
        boxes.append(Box(left, left + width, y - 5, y + 5))
    for i, box in enumerate(boxes):
        assert page.holds(box)
        assert not Box(20, 380, 56, 64).meets(box)
        assert not any(box.meets(other) for other in boxes[:i])


def test_the_first_change_and_the_best_of_other_kinds_are_told_in_full():
    fixes = made_up.work().detuning.fixes
    ranked = [
        replace(fixes[0], rank=rank, kind=kind)
        for rank, kind in enumerate(["move", "move", "move", "support", "mass", "move"], start=1)
    ]
    assert [fix.rank for fix in detailed(ranked)] == [1, 4, 5]
    assert [fix.rank for fix in detailed(ranked[:3])] == [1, 2, 3]
    assert len(detailed(ranked)) == DETAILED
    assert detailed([]) == []


def test_the_sensitivity_stands_as_used_and_as_the_job_file_says(tmp_path: Path):
    path = job_with(tmp_path, "tap.flac")
    path.write_text(
        path.read_text(encoding="utf-8") + 'sensitivity = "100 mV/g"\nfull_scale = "1 V"\n',
        encoding="utf-8",
    )
    job = load_job(path)
    work = replace(made_up.work(), job=job, taps=(), running=())
    part = recordings(made_up.Results(work, basis_of(job)))
    cells = [c for b in part.blocks if isinstance(b, Table) for row in b.rows for c in row]
    assert "98.07 m/s^2 per unit of sample (100 mV/g, full scale 1 V)" in cells


@pytest.mark.parametrize("name", ["sheet.pdf", "job.toml", "sheet"])
def test_only_html_and_markdown_are_written(name: str, tmp_path: Path):
    with pytest.raises(InputError, match=r"\.html or \.md"):
        check_target(tmp_path / name)


def test_the_usual_place_is_beside_the_job():
    assert usual_path(made_up.job()) == Path("/plant/glycol/job-sheet.html")
