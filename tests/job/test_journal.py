"""Unsaved work that is kept, and the list of recent jobs."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from fieldkit.job import journal, recent
from fieldkit.job.changes import change_label
from fieldkit.job.journal import Kept
from fieldkit.job.store import JobText, new_job_text


def kept(path: Path | None = None, **changes: object) -> Kept:
    fields = {"key": journal.key_of(path), "path": str(path or ""), "text": "as changed"}
    return Kept(**(fields | changes))  # type: ignore[arg-type]


def test_what_is_kept_for_a_file_is_found_under_every_name_of_that_file(tmp_path: Path) -> None:
    job = tmp_path / "job.toml"
    journal.keep(kept(job), tmp_path)
    found = journal.kept_for(tmp_path / "." / "sub" / ".." / "job.toml", "as saved", tmp_path)
    assert found is not None
    assert found.text == "as changed"
    assert found.process == os.getpid()


def test_what_the_file_holds_already_is_not_offered(tmp_path: Path) -> None:
    job = tmp_path / "job.toml"
    journal.keep(kept(job), tmp_path)
    assert journal.kept_for(job, "as changed", tmp_path) is None
    typing = {"table": "leg", "values": {"length": "4"}}
    journal.keep(kept(job, typing=typing), tmp_path)
    assert journal.kept_for(job, "as changed", tmp_path) is not None


def test_two_new_jobs_do_not_share_a_place(tmp_path: Path) -> None:
    for title in ("one", "two"):
        journal.keep(kept(title=title), tmp_path)
    assert {k.title for k in journal.all_kept(tmp_path)} == {"one", "two"}
    assert all(k.stands_alone for k in journal.all_kept(tmp_path))


def test_what_was_dropped_is_gone_and_dropping_twice_is_no_fault(tmp_path: Path) -> None:
    one = kept()
    journal.keep(one, tmp_path)
    journal.drop(one.key, tmp_path)
    journal.drop(one.key, tmp_path)
    assert journal.all_kept(tmp_path) == ()


@pytest.mark.parametrize("damage", [b"", b"{", b"[]", b'{"key": 1', b"\xff\xfe"])
def test_a_damaged_entry_is_passed_over(tmp_path: Path, damage: bytes) -> None:
    journal.keep(kept(title="whole"), tmp_path)
    (tmp_path / "unsaved" / "bad.json").write_bytes(damage)
    assert [k.title for k in journal.all_kept(tmp_path)] == ["whole"]


def test_an_interrupted_write_leaves_the_one_before(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Killed between the writing and the renaming, the old entry is whole."""
    one = kept()
    journal.keep(one, tmp_path)

    def killed(_self: Path, _target: Path) -> Path:
        raise KeyboardInterrupt

    monkeypatch.setattr(Path, "replace", killed)
    with pytest.raises(KeyboardInterrupt):
        journal.keep(kept(key=one.key, text="newer"), tmp_path)
    found = journal.kept_under(one.key, tmp_path)
    assert found is not None
    assert found.text == "as changed"


def test_a_folder_that_cannot_be_written_raises_for_work_and_is_silent_for_the_list(
    tmp_path: Path,
) -> None:
    blocked = tmp_path / "file"
    blocked.write_text("not a folder")
    with pytest.raises(OSError):  # noqa: PT011
        journal.keep(kept(), blocked)
    recent.remember(tmp_path / "job.toml", folder=blocked)
    assert recent.recents(blocked) == ()


def test_the_process_that_keeps_is_told_from_one_that_is_gone() -> None:
    assert not journal.keeper_lives(kept(process=os.getpid()))
    assert not journal.keeper_lives(kept(process=2**22 + 12345))
    assert journal.keeper_lives(kept(process=os.getppid())) is (os.name == "posix")


def test_recent_jobs_are_listed_newest_first_and_once(tmp_path: Path) -> None:
    for name in ("a.toml", "b.toml", "a.toml"):
        recent.remember(tmp_path / name, folder=tmp_path)
    assert [Path(one.path).name for one in recent.recents(tmp_path)] == ["a.toml", "b.toml"]
    recent.forget(tmp_path / "a.toml", tmp_path)
    assert [Path(one.path).name for one in recent.recents(tmp_path)] == ["b.toml"]


def test_a_list_that_grows_is_cut(tmp_path: Path) -> None:
    for number in range(recent.MOST + 5):
        recent.remember(tmp_path / f"{number}.toml", folder=tmp_path)
    assert len(recent.recents(tmp_path)) == recent.MOST


def test_the_state_of_a_job_is_told_from_the_file_unless_it_is_the_very_same(
    tmp_path: Path,
) -> None:
    job = tmp_path / "job.toml"
    new_job_text().save(job)
    assert recent.state_of(job) == recent.NO_RECORDINGS
    recent.remember(job, "3 taps, matched, best fix 94 %", tmp_path)
    (known,) = recent.recents(tmp_path)
    assert recent.state_of(job, known) == "3 taps, matched, best fix 94 %"
    text = job.read_text() + '\n[[measured]]\nfrequency = "23 Hz"\n'
    job.write_text(text)
    assert recent.state_of(job, known) == "1 measurement, changed since"
    job.write_text("fieldkit = 1\ntitle = oops")
    assert recent.state_of(job, known).startswith("cannot be read: ")
    job.unlink()
    assert recent.state_of(job, known) == recent.GONE


def test_a_job_opened_again_keeps_what_was_known_of_it(tmp_path: Path) -> None:
    job = tmp_path / "job.toml"
    new_job_text().save(job)
    recent.remember(job, "matched", tmp_path)
    recent.remember(job, folder=tmp_path)
    assert recent.recents(tmp_path)[0].state == "matched"


def test_job_files_are_told_from_others_by_their_first_lines(tmp_path: Path) -> None:
    job, other = tmp_path / "job.toml", tmp_path / "pyproject.toml"
    new_job_text().save(job)
    other.write_text('[project]\nname = "fieldkit-like"\n')
    assert recent.is_job(job)
    assert not recent.is_job(other)
    assert not recent.is_job(tmp_path / "missing.toml")


START = new_job_text()


@pytest.mark.parametrize(
    ("after", "label"),
    [
        (START.with_value("title", "Pump"), "title: New job → Pump"),
        (START.with_value("leg[0].length", "5 m"), "leg 1 length: 4.0 m → 5 m"),
        (START.with_value("support[1].vertical", "rigid"),
         "support 2 vertical: left out → rigid"),
        (START.with_new("mass", {"at": "1 m", "mass": "7 kg"}), "mass 1 added"),
        (START.without("support", 0), "support 1 removed"),
        (START.with_value("goal.margin", "0.3"), "goal margin: left out → 0.3"),
        (JobText(START.text + "# seen\n"), "comments"),
    ],
)  # fmt: skip
def test_a_change_is_named_in_a_few_words(after: JobText, label: str) -> None:
    assert change_label(START, after) == label


def test_many_changes_at_once_are_summed_up() -> None:
    after = START.with_value("title", "x").with_value("units", "US")
    after = after.with_value("pipe.schedule", "80").with_value("leg[0].length", "9 m")
    assert change_label(START, after).endswith(" and 2 more")
