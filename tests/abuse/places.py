"""Files that are somewhere odd: linked, missing, unreadable, vanishing, on a full disk."""

from __future__ import annotations

import os
import subprocess
import tempfile
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from functools import partial
from pathlib import Path
from unittest.mock import patch

from tests.abuse.audio import wav
from tests.abuse.case import INPUT, JOB, READ, TAP, Case

TOOLS = (("peaks", INPUT), ("running", INPUT), ("span", INPUT), ("recheck", INPUT, INPUT))
JOB_TOOLS = (("peaks", INPUT), ("match", INPUT))
FULL_BYTES = 65_536


def _file(folder: Path, name: str, content: bytes) -> Path:
    path = folder / name
    path.write_bytes(content)
    return path


def _dangling(folder: Path) -> Path:
    path = folder / "tap.wav"
    path.symlink_to(folder / "gone.wav")
    return path


def _circle(name: str, folder: Path) -> Path:
    (folder / "b").symlink_to(folder / name)
    (folder / name).symlink_to(folder / "b")
    return folder / name


def _linked(folder: Path) -> Path:
    path = folder / "linked.wav"
    path.symlink_to(_file(folder, "tap.wav", wav()))
    return path


def _pipe(name: str, folder: Path) -> Path:
    os.mkfifo(folder / name)
    return folder / name


def _folder(name: str, folder: Path) -> Path:
    (folder / name).mkdir()
    return folder / name


def _device(_: Path) -> Path:
    return Path("/dev/zero")


def _job_naming(recording: str, folder: Path) -> Path:
    return _file(folder, "job.toml", (JOB + TAP.replace("tap.wav", recording)).encode())


def _job(folder: Path) -> Path:
    _file(folder, "tap.wav", wav())
    return _file(folder, "job.toml", (JOB + TAP).encode())


def _job_with_sheet(folder: Path) -> Path:
    """Only a sheet may be written over."""
    from tests.abuse.trial import in_process

    job = _job(folder)
    assert in_process(["sheet", str(job), "-o", str(folder / "out.md")]).status == 0
    return job


@contextmanager
def vanishing(_: Path) -> Iterator[None]:
    """Each recording is gone by the time libsndfile opens it."""
    import soundfile

    plain = soundfile.SoundFile

    def gone(file: object, *words: object, **more: object) -> object:
        if isinstance(file, (str, Path)):
            Path(file).unlink(missing_ok=True)
        return plain(file, *words, **more)

    with patch.object(soundfile, "SoundFile", gone):
        yield


@contextmanager
def unreadable(folder: Path) -> Iterator[None]:
    """No file in the folder may be read; for root too, whom modes do not stop."""
    plain: Callable[..., int] = os.open

    with patch("io.open", _refusing(folder, open)), patch("os.open", _refusing(folder, plain)):
        yield


def _refusing(folder: Path, plain: Callable[..., object]) -> Callable[..., object]:
    def opened(file: object, *words: object, **more: object) -> object:
        if str(file).startswith(str(folder)):
            raise PermissionError(13, "Permission denied", str(file))
        return plain(file, *words, **more)

    return opened


@contextmanager
def full_disk(folder: Path) -> Iterator[None]:
    """The folder's files lie on a file system with no room left."""
    kept = {path.name: path.read_bytes() for path in folder.iterdir()}
    room = FULL_BYTES + sum(len(content) for content in kept.values())
    mount = ["mount", "-t", "tmpfs", "-o", f"size={room}", "none", str(folder)]
    subprocess.run(mount, check=True, capture_output=True)
    try:
        for name, content in kept.items():
            (folder / name).write_bytes(content)
        _fill(folder / "filler")
        yield
        kept = {name: (folder / name).read_bytes() for name in kept if (folder / name).exists()}
    finally:
        subprocess.run(["umount", "-l", str(folder)], check=True, capture_output=True)
    for name, content in kept.items():
        (folder / name).write_bytes(content)


def _fill(path: Path) -> None:
    with path.open("wb", buffering=0) as file:
        for size in (4096, 1):
            try:
                while True:
                    file.write(b"x" * size)
            except OSError:
                continue


def can_mount() -> bool:
    """Whether this process may mount a small file system."""
    if os.geteuid() != 0:
        return False
    with tempfile.TemporaryDirectory() as folder:
        mount = ["mount", "-t", "tmpfs", "-o", "size=64k", "none", folder]
        try:
            subprocess.run(mount, check=True, capture_output=True)
        except (OSError, subprocess.CalledProcessError):
            return False
        subprocess.run(["umount", "-l", folder], check=True, capture_output=True)
    return True


def cases() -> Iterator[Case]:
    """All that this system allows."""
    for name in ("tap.wav", "tap.csv", "job.toml"):
        yield Case(f"{name} missing", lambda folder, name=name: folder / name, TOOLS)
        yield Case(f"{name} links to itself", partial(_circle, name), TOOLS)
        yield Case(f"{name} is a folder", partial(_folder, name), TOOLS)
        yield Case(f"{name} is a pipe", partial(_pipe, name), TOOLS)
        content = wav() if name.endswith("wav") else JOB.encode()
        yield Case(
            f"{name} unreadable", partial(_file, name=name, content=content), TOOLS, unreadable
        )
    yield Case("link to nothing", _dangling, READ)
    yield Case("link to a recording", _linked, READ)
    yield Case("endless device", _device, READ)
    yield Case("file name too long", lambda folder: folder / ("x" * 300 + ".wav"), READ)
    yield Case("name with a null", lambda folder: folder / "a\0b.wav", READ[:1], alone=False)
    yield Case("name of escapes", lambda folder: folder / "\x1b[2J\u009b31m.wav", READ)
    yield Case("name half a letter", lambda folder: Path(f"{folder}/\udcff.wav"), READ)
    for recording in (
        "job.toml",
        ".",
        "/dev/zero",
        "../..",
        "/etc/passwd",
        "no such.wav",
        "~/x.wav",
        "x" * 190 + ".wav",
        "http://127.0.0.1:1/x.wav",
    ):
        yield Case(f"job names {recording[:20]}", partial(_job_naming, recording), JOB_TOOLS)
    yield Case(
        "recording vanishes", lambda f: _file(f, "tap.wav", wav()), READ, vanishing, alone=False
    )
    yield Case("job's recording vanishes", _job, JOB_TOOLS, vanishing, alone=False)
    yield Case("sheet over the job", _job, (("sheet", INPUT, "-o", INPUT),))
    yield Case("sheet over a recording", _job, (("sheet", INPUT, "-o", "{folder}/tap.wav"),))
    yield Case("sheet into no folder", _job, (("sheet", INPUT, "-o", "{folder}/a/b.html"),))
    yield Case("sheet onto a folder", _job, (("sheet", INPUT, "-o", "{folder}"),))
    yield Case("sheet into nothing", _job, (("sheet", INPUT, "-o", "/dev/full"),))
    yield Case("bundle over the job", _job, (("sheet", INPUT, "--bundle", INPUT),))
    yield Case("response over the tap", _job, (("peaks", INPUT, "--response", "{folder}/tap.wav"),))
    if can_mount():
        copied = (("sample", "{folder}/samples"),)
        yield Case("disk full of samples", _job, copied, full_disk, alone=False)
        sheet = (
            ("sheet", INPUT, "-o", "{folder}/out.md"),
            ("sheet", INPUT, "--bundle", "{folder}/b.zip"),
        )
        yield Case("disk full", _job_with_sheet, sheet, full_disk, alone=False)
