"""One job has one answer: again, on more threads, and whether or not anyone watches."""

from __future__ import annotations

import json
import os
import pty
import subprocess
import sys
from pathlib import Path

import pytest

from tests.abuse.audio import wav
from tests.abuse.case import JOB, TAP

PROGRAM = "from fieldkit.__main__ import main; main()"


def answer(job: Path, threads: int, *, watched: bool = False) -> str:
    """The JSON of ``fieldkit detune``; watched, its progress goes to a terminal."""
    environment = os.environ | {
        "OPENBLAS_NUM_THREADS": str(threads),
        "OMP_NUM_THREADS": str(threads),
    }
    master, terminal = pty.openpty()
    try:
        done = subprocess.run(
            [sys.executable, "-c", PROGRAM, "detune", str(job), "--json"],
            env=environment,
            stdout=subprocess.PIPE,
            stderr=terminal if watched else subprocess.PIPE,
            check=True,
            timeout=250,
        )
        if watched:
            assert b"%" in os.read(master, 100_000)
    finally:
        os.close(terminal)
        os.close(master)
    return done.stdout.decode()


@pytest.fixture(scope="module")
def job(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("job")
    (folder / "tap.wav").write_bytes(wav())
    path = folder / "job.toml"
    path.write_text(JOB + TAP, "utf-8")
    return path


def test_the_same_job_has_the_same_answer_to_the_last_figure(job):
    """Again, on two threads instead of one, with its progress shown."""
    first = answer(job, 1)
    assert json.loads(first)["fixes"]
    assert answer(job, 2, watched=True) == first
