"""The bundle: whole, checked by hashes, safe to unpack, and a job that works from inside."""

from __future__ import annotations

import hashlib
import json
import zipfile
from dataclasses import replace
from pathlib import Path, PurePosixPath

import pytest

from fieldkit.errors import InputError
from fieldkit.job.schema import load_job
from fieldkit.sheet import bundle
from fieldkit.sheet.bundle import check_bundle, write_bundle
from tests.cli.test_bad_input import JOB
from tests.sheet import made_up

RECORDING = '\n[[recording]]\nfile = "{}"\nkind = "tap"\n'


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    here = tmp_path / "job"
    here.mkdir()
    return here


def job_with(folder: Path, *names: str) -> Path:
    """A job that names these recordings; each holds its own name."""
    path = folder / "job.toml"
    text = JOB + "".join(RECORDING.format(name.replace("\\", "\\\\")) for name in names)
    path.write_text(text, encoding="utf-8")
    for name in names:
        (folder / name).parent.mkdir(parents=True, exist_ok=True)
        (folder / name).write_bytes(name.encode())
    return path


def bundled(path: Path, out: Path) -> zipfile.ZipFile:
    write_bundle(load_job(path), made_up.document(), out)
    return zipfile.ZipFile(out)


def test_every_file_is_there_with_its_hash(folder: Path, tmp_path: Path):
    path = job_with(folder, "tap.flac", "more/run.wav")
    (folder / "tap.flac.toml").write_text("# beside it", encoding="utf-8")
    with bundled(path, tmp_path / "out.zip") as held:
        told = json.loads(held.read("manifest.json"))
        files = {one["file"]: one for one in told["files"]}
        assert set(files) == {
            "job.toml", "sheet.html", "sheet.md", "tap.flac", "tap.flac.toml", "more/run.wav",
        }  # fmt: skip
        assert set(held.namelist()) == {*files, "manifest.json"}
        for name, one in files.items():
            assert one["sha256"] == hashlib.sha256(held.read(name)).hexdigest()
        assert held.read("job.toml") == path.read_bytes()


def test_the_packed_job_finds_its_recordings(folder: Path, tmp_path: Path):
    outside = tmp_path / "elsewhere"
    outside.mkdir()
    (outside / "tap.flac").write_bytes(b"outside")
    path = job_with(folder, "tap.flac", str(outside / "tap.flac"), "../elsewhere/tap.flac")
    (outside / "tap.flac").write_bytes(b"outside")
    with bundled(path, tmp_path / "out.zip") as held:
        held.extractall(tmp_path / "office")
    job = load_job(tmp_path / "office" / "job.toml")
    assert [entry.path.read_bytes() for entry in job.recordings] == [
        b"tap.flac", b"outside", b"outside",
    ]  # fmt: skip


@pytest.mark.parametrize(
    "name", ["../up.flac", "a\\b.flac", "c:d.flac", "<img>.flac", "tap\x1b[31m.flac", "sheet.html"]
)
def test_names_inside_are_relative_and_safe(name: str, folder: Path, tmp_path: Path):
    path = folder / "job.toml"
    path.write_text(JOB + RECORDING.format("tap.flac"), encoding="utf-8")
    (folder / name).write_bytes(b"sound")
    job = load_job(path)
    job = replace(job, recordings=(replace(job.recordings[0], path=folder / name),))
    write_bundle(job, made_up.document(), tmp_path / "out.zip")
    with zipfile.ZipFile(tmp_path / "out.zip") as held:
        for inside in held.namelist():
            parts = PurePosixPath(inside).parts
            assert not PurePosixPath(inside).is_absolute()
            assert ".." not in parts
            assert not set(inside) & set('\\:<>|?*"\x1b')
        assert any(held.read(inside) == b"sound" for inside in held.namelist())
        assert "fieldkit sheet" in held.read("sheet.html").decode()[:400]


def test_a_missing_recording_is_named_in_one_sentence(folder: Path, tmp_path: Path):
    path = job_with(folder, "tap.flac")
    (folder / "tap.flac").unlink()
    with pytest.raises(InputError, match=r"tap\.flac.*missing.*take it out of the job"):
        check_bundle(load_job(path), tmp_path / "out.zip")
    assert not (tmp_path / "out.zip").exists()


def test_a_zip_of_another_kind_is_never_written_over(folder: Path, tmp_path: Path):
    path = job_with(folder, "tap.flac")
    other = tmp_path / "holiday.zip"
    with zipfile.ZipFile(other, "w") as held:
        held.writestr("photo.txt", "sea")
    with pytest.raises(InputError, match="no bundle"):
        write_bundle(load_job(path), made_up.document(), other)
    assert zipfile.ZipFile(other).namelist() == ["photo.txt"]


def test_the_same_bundle_gives_the_same_bytes_and_replaces_itself(folder: Path, tmp_path: Path):
    path, out = job_with(folder, "tap.flac"), tmp_path / "out.zip"
    bundled(path, out).close()
    first = out.read_bytes()
    bundled(path, out).close()
    assert out.read_bytes() == first
    assert [one.name for one in tmp_path.iterdir() if one.is_file()] == ["out.zip"]


def test_a_recording_that_goes_while_it_is_packed_leaves_the_older_bundle_whole(
    folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
):
    path, out = job_with(folder, "tap.flac"), tmp_path / "out.zip"
    bundled(path, out).close()
    older = out.read_bytes()
    (folder / "tap.flac").unlink()
    monkeypatch.setattr(bundle, "check_bundle", lambda _job, _path: None)
    with pytest.raises(InputError, match=r"tap\.flac.*cannot be read"):
        bundled(path, out)
    assert out.read_bytes() == older
    assert [one.name for one in tmp_path.iterdir() if one.is_file()] == ["out.zip"]
