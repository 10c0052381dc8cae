"""The open job: what is unsaved, and the way back."""

from __future__ import annotations

from pathlib import Path

from fieldkit.job.store import JobText
from fieldkit.ui.document import STEPS_BACK, OpenJob
from tests.ui.job_text import JOB_TEXT

TEXT = JobText(JOB_TEXT, Path("job.toml"))


def test_a_change_is_unsaved_until_it_is_saved_or_taken_back() -> None:
    opened = OpenJob(TEXT, TEXT)
    changed = opened.edited(TEXT.with_value("title", "Other"))
    assert not opened.unsaved
    assert changed.unsaved
    assert not changed.undone().unsaved
    assert not changed.as_saved(changed.text).unsaved


def test_a_new_job_is_unsaved() -> None:
    assert OpenJob(TEXT, None).unsaved


def test_undo_after_saving_elsewhere_stays_with_the_new_file(tmp_path: Path) -> None:
    changed = OpenJob(TEXT, TEXT).edited(TEXT.with_value("title", "Other"))
    saved = changed.as_saved(changed.text.save(tmp_path / "new.toml"))
    assert saved.undone().path == tmp_path / "new.toml"
    assert saved.undone().text.text == JOB_TEXT


def test_the_way_back_is_long_but_not_endless() -> None:
    opened = OpenJob(TEXT, TEXT)
    for number in range(STEPS_BACK + 5):
        opened = opened.edited(TEXT.with_value("title", str(number)))
    assert len(opened.past) == STEPS_BACK
    assert OpenJob(TEXT, TEXT).undone().text is TEXT
