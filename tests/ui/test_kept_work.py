"""A killed program or a dropped line loses the last key press at most."""

from __future__ import annotations

import sys
from pathlib import Path

import pytest

from fieldkit.job import journal
from fieldkit.job.store import load_text, new_job_text

if sys.platform == "win32":
    pytest.skip("needs pseudo terminals", allow_module_level=True)

from tests.ui.terminal import terminal


def test_a_description_that_was_killed_goes_on_where_it_was(tmp_path: Path) -> None:
    """kill -9 right behind a key press, in the guided path: all keys before it are there."""
    state = tmp_path / "home"
    with terminal([], tmp_path, state) as shown:
        shown.until("Sample job")
        shown.type("n")
        shown.until("What pipe")
        for number in range(1, len("Booster")):
            shown.type("Booster"[number - 1])
            shown.until(f"New job: {'Booster'[:number]}")
        shown.type("r")
        shown.kill()
    (kept,) = journal.all_kept(state / "fieldkit")
    assert kept.draft["pipe"]["title"] in ("Booste", "Booster")
    with terminal([], tmp_path, state) as shown:
        shown.until("Booste")
        shown.type("r")
        shown.until("What pipe")
    assert not list(tmp_path.glob("*.toml"))


def test_changes_and_a_half_typed_form_are_offered_after_a_kill(tmp_path: Path) -> None:
    """One change taken, the next half typed; the file itself is as it was saved."""
    state, job = tmp_path / "home", tmp_path / "job.toml"
    new_job_text().save(job)
    saved = job.read_bytes()
    with terminal([str(job)], tmp_path, state) as shown:
        shown.until("New job")
        shown.type("3")
        shown.until("as described")
        shown.type("\r")
        shown.until("enter takes all")
        shown.type("X")
        shown.until("New jobX")
        shown.type("\r")
        shown.until("unsaved")
        shown.type("\r")
        shown.until("enter takes all")
        shown.type("Y")
        shown.until("New jobXY")
        shown.type("Z")
        shown.kill()
    assert job.read_bytes() == saved
    kept = journal.kept_for(job, load_text(job).text, state / "fieldkit")
    assert kept is not None
    assert 'title = "New jobX"' in kept.text
    assert kept.typing["values"]["title"] in ("New jobXY", "New jobXYZ")
    with terminal([str(job)], tmp_path, state) as shown:
        shown.until("were never saved")
        shown.type("\r")
        shown.until("New jobXY")


def test_a_dropped_line_leaves_what_was_typed(tmp_path: Path) -> None:
    """The terminal goes away, as it does when an SSH connection breaks."""
    state = tmp_path / "home"
    with terminal([], tmp_path, state) as shown:
        shown.until("Sample job")
        shown.type("n")
        shown.until("What pipe")
        shown.type("R")
        shown.until("New job: R")
        shown.hang_up()
    (kept,) = journal.all_kept(state / "fieldkit")
    assert kept.draft["pipe"]["title"] == "R"
