"""A recheck from recordings on the disk: right on what was truly built, and plain on bad input."""

from __future__ import annotations

import shutil
from dataclasses import replace
from functools import cache
from pathlib import Path

import pytest

from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.sidecar import RecordingInfo, write_info
from fieldkit.errors import InputError, Refusal
from fieldkit.job.document import RecordingEntry
from fieldkit.sheet.recheck import document, lines
from fieldkit.workup.rechecking import Rechecked, promised_fix, rechecked
from fieldkit.workup.retaps import retaps, state_of_retap
from tests.workup.retapped import JOB, NOT_STRUCK, brace, record, work


@cache
def fix():
    """The first brace that is promised."""
    return next(fix for fix in work().detuning.fixes if fix.kind == "support")


def answer(folder: Path, share: float | None) -> Rechecked:
    """With the brace at a share of what was drawn, or without it."""
    change = fix().change
    k = (share or 0.0) * change.vertical_n_per_m
    files = record(folder, *([brace(change.at_m, k, k)] if share else []))
    job = work().job
    return rechecked(work(), fix(), retaps(job, files), state_of_retap(job))


@cache
def built(share: float | None) -> Rechecked:
    from tempfile import TemporaryDirectory

    with TemporaryDirectory() as folder:
        return answer(Path(folder), share)


def test_as_promised_it_worked():
    found = built(1.1)
    assert document(found)["verdict"] == "worked"
    seen = [mode for mode in document(found)["predicted"] if mode["measured_hz"]]
    assert len(seen) == 2
    assert all(mode["inside"] for mode in seen)
    assert document(found)["reasons"] == []
    assert document(found)["chance_now"] >= found.work.job.goal.chance


def test_at_a_fifth_of_its_stiffness_it_did_not_and_the_stiffness_is_why():
    """The interval of the stiffness holds the truth, and the next change is offered."""
    found = document(built(0.2))
    assert found["verdict"] == "did_not_work"
    assert found["reasons"][0]["reason"] == "stiffness"
    assert not any(mode["inside"] for mode in found["predicted"] if mode["measured_hz"])
    stiffness = [one for one in found["found"] if one["unit"] == "N/m"]
    assert len(stiffness) == 2
    for one in stiffness:
        assert one["low"] < 0.2 * one["drawn"] < one["high"]
    assert found["next_fixes"]
    assert found["mended"]["chance"] > 0.5


def test_nothing_installed_is_said_plainly():
    found = built(None)
    assert document(found)["verdict"] == "did_not_work"
    assert document(found)["reasons"][0]["reason"] == "nothing"
    assert "rings as it did before" in " ".join(lines(found)).replace("\n", " ")


def test_the_text_says_the_verdict_first_and_fits_the_page():
    for share, first in ((1.1, "It worked"), (0.2, "It did not work"), (None, "It did not work")):
        text = lines(built(share))
        assert text[0].startswith(first)
        assert all(len(line) <= 80 for line in text), max(text, key=len)
        assert "responsible piping engineer" in " ".join(text)


def test_the_jobs_own_recordings_are_recognised(tmp_path):
    """A copy of a file from before the change is named as one."""
    shutil.copy(JOB.parent / "tap-vertical.flac", tmp_path / "tap-vertical.flac")
    found = retaps(work().job, [tmp_path / "tap-vertical.flac"])
    assert any("same recording" in note for note in found.notes)


def test_no_usable_tap_is_refused_with_what_to_record(tmp_path):
    """Silence where blows should be."""
    files = record(tmp_path, hits=NOT_STRUCK)
    job = work().job
    with pytest.raises(Refusal, match="no usable tap") as refused:
        rechecked(work(), fix(), retaps(job, files), state_of_retap(job))
    assert "three taps" in refused.value.measure_next


def named(folder: Path, *names: str) -> list[Path]:
    paths = [folder / name for name in names]
    for path in paths:
        path.write_bytes(b"")
    return paths


def directions(entries: tuple[RecordingEntry, ...]) -> list[str | None]:
    return [entry.direction for entry in entries]


def test_a_set_up_is_told_by_name_direction_number_or_order(tmp_path):
    job = work().job
    by_name = retaps(job, named(tmp_path, "tap-lateral.wav"))
    assert directions(by_name.entries) == ["lateral"]
    assert "taken to be" in by_name.notes[0]
    by_word = retaps(job, named(tmp_path, "after lateral 2.wav"))
    assert directions(by_word.entries) == ["lateral"]
    by_number = retaps(job, named(tmp_path, "a.wav", "b.wav"), like=(2, 1))
    assert directions(by_number.entries) == ["lateral", "vertical"]
    by_order = retaps(job, named(tmp_path, "a.wav", "b.wav"))
    assert directions(by_order.entries) == ["vertical", "lateral"]


def test_what_stands_beside_a_recording_comes_first(tmp_path):
    """Its own direction and place, whatever it is called."""
    (path,) = named(tmp_path, "tap-lateral.wav")
    channel = ChannelSetup("acceleration", scale="9.81 m/s^2", direction="vertical", at="0.3 m")
    write_info(path, RecordingInfo("an input", 4000, (channel,), "2024-05-01T10:00:00+02:00"))
    found = retaps(work().job, [path])
    assert directions(found.entries) == ["vertical"]
    assert found.entries[0].at_m == pytest.approx(0.3)
    assert not found.notes


@pytest.mark.parametrize(
    ("names", "like", "says"),
    [
        (("a.wav",), (), "how a.wav was set up"),
        (("a.wav",), (7,), "no recording 7"),
        (("a.wav", "b.wav"), (1,), "--like is given 1 times"),
    ],
)
def test_a_set_up_that_nobody_told_is_asked_for(tmp_path, names, like, says):
    with pytest.raises(InputError, match=says):
        retaps(work().job, named(tmp_path, *names), like=like)


def test_a_file_that_is_not_there_is_named(tmp_path):
    with pytest.raises(InputError, match="no such file"):
        retaps(work().job, [tmp_path / "gone.wav"])
    with pytest.raises(InputError, match="a folder"):
        retaps(work().job, [tmp_path])


def test_the_state_of_the_retap():
    job = work().job
    assert state_of_retap(job) == job.tapped
    assert state_of_retap(job, state="running") == job.running
    assert state_of_retap(job, 0.5).fill == (0.5, 0.5)
    with pytest.raises(InputError, match="fill"):
        state_of_retap(job, 1.5)


def test_a_change_that_was_not_offered_cannot_be_rechecked():
    with pytest.raises(InputError, match="no change 99"):
        promised_fix(work(), 99)
    with pytest.raises(Refusal, match="nothing was promised"):
        promised_fix(replace(work(), detuning=None))
