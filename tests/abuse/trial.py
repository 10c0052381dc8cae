"""Put cases before the commands, and say of each run what was wrong with how it ended.

A run must end by itself with status 0, 1 or 2, within LIMIT_S of processor time and LIMIT_BYTES of
memory; without status 0 in one sentence; print no control characters; and leave every file that
was there as it was.
"""

from __future__ import annotations

import hashlib
import os
import re
import resource
import signal
import sys
import tempfile
import traceback
from collections.abc import Callable, Iterable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from types import FrameType

from tests.abuse.case import INPUT, Case

LIMIT_S = 10.0
LIMIT_BYTES = 500e6
_CONTROL = re.compile(r"[\x00-\x08\x0b-\x1f\x7f-\x9f\u202a-\u202e\u2066-\u2069]")
_RUN = "from fieldkit.__main__ import main; main()"


class TimeUp(BaseException):
    """The processor time of one run is over."""


@dataclass(frozen=True)
class Ended:
    """How a run ended."""

    status: int
    out: str
    err: str
    seconds: float
    """Of processor time."""
    most_bytes: float
    """Peak of the process; in one process that of all runs so far, where this one raised it."""


@dataclass
class Tally:
    """Counts over all runs."""

    files: int = 0
    runs: int = 0
    results: int = 0
    sentences: int = 0
    slowest: tuple[float, str] = (0.0, "")
    largest: tuple[float, str] = (0.0, "")
    failures: list[str] = field(default_factory=list)
    tell: Callable[[str], object] = lambda _: None
    """Called with each failure as it comes."""

    def note(self, name: str, ended: Ended, faults: list[str]) -> None:
        """Count one run."""
        self.runs += 1
        self.results += ended.status == 0
        self.sentences += ended.status in (1, 2)
        self.slowest = max(self.slowest, (ended.seconds, name))
        if ended.most_bytes > self.largest[0]:
            self.largest = (ended.most_bytes, name)
        self.failures += [f"{name}: {fault}" for fault in faults]
        for fault in faults:
            self.tell(f"FAILED {name}: {fault}\n")

    def line(self) -> str:
        """All counts in one line."""
        return (
            f"{self.files} files tried in {self.runs} runs: {self.results} results, "
            f"{self.sentences} sentences, failures {len(self.failures)}; slowest "
            f"{self.slowest[0]:.1f} s ({self.slowest[1]}), most memory "
            f"{self.largest[0] / 1e6:.0f} MB ({self.largest[1]})"
        )


def tried(cases: Iterable[Case], tally: Tally, *, alone: bool = False) -> Tally:
    """Every command of every case, in this process or each in its own."""
    for case in cases:
        if alone and not case.alone:
            continue
        tally.files += 1
        for command in case.commands:
            with tempfile.TemporaryDirectory() as name:
                folder = Path(name)
                words = _words(command, case.build(folder), folder)
                before = _prints(folder)
                run = in_own_process if alone else in_process
                with case.around(folder):
                    ended = run(words)
                faults = [*judged(ended), *_changed(before, _prints(folder))]
                tally.note(f"{case.name} | {' '.join(command)}", ended, faults)
    return tally


def judged(ended: Ended) -> Iterator[str]:
    """What is wrong with how a run ended."""
    told = ended.err.strip()
    if ended.status not in (0, 1, 2):
        yield f"status {ended.status}: {told[-300:]!r}"
    if "Traceback" in ended.err or "Traceback" in ended.out:
        yield f"traceback: {told[-600:]}"
    if ended.status in (1, 2) and not told:
        yield "no sentence"
    if len(told) > 2000 or (ended.status in (1, 2) and len(told.splitlines()) > 6):
        yield f"more than a sentence: {told[:200]!r} ({len(told)} characters)"
    found = _CONTROL.search(ended.out + ended.err)
    if found is not None:
        around = (ended.out + ended.err)[max(0, found.start() - 30) : found.end() + 10]
        yield f"control character in {around!r}"
    unanswered = re.search(r".*(?:\bnan\b|NaN|Infinity).*", ended.out)
    if unanswered is not None:
        yield f"not a number in the answer: {unanswered[0]}"
    if ended.seconds > LIMIT_S:
        yield f"{ended.seconds:.1f} s of processor time"
    if ended.most_bytes > LIMIT_BYTES:
        yield f"{ended.most_bytes / 1e6:.0f} MB"


def in_process(words: list[str]) -> Ended:
    """Through the command line's own entry, as a call."""
    from typer.testing import CliRunner

    from fieldkit.cli.commands import app

    start, before = _processor_s(), _peak_bytes()
    try:
        with _time_limit():
            result = CliRunner().invoke(app, words, prog_name="fieldkit")
    except TimeUp:
        where = "".join(traceback.format_exc().splitlines(keepends=True)[-4:])
        return Ended(-1, "", f"ran out of time: {where}", _processor_s() - start, _raised(before))
    err = result.stderr
    if result.exception is not None and not isinstance(result.exception, SystemExit):
        err += "".join(traceback.format_exception(result.exception))
    return Ended(result.exit_code, result.stdout, err, _processor_s() - start, _raised(before))


def in_own_process(words: list[str]) -> Ended:
    """As the installed program; killed by the system at twice the time allowed."""
    with tempfile.TemporaryFile() as out, tempfile.TemporaryFile() as err:
        pid = os.posix_spawn(
            sys.executable,
            [sys.executable, "-c", _RUN, *words],
            {**os.environ, "PYTHONWARNINGS": "default"},
            file_actions=[
                (os.POSIX_SPAWN_OPEN, 0, "/dev/null", os.O_RDONLY, 0),
                (os.POSIX_SPAWN_DUP2, out.fileno(), 1),
                (os.POSIX_SPAWN_DUP2, err.fileno(), 2),
            ],
        )
        resource.prlimit(pid, resource.RLIMIT_CPU, (int(2 * LIMIT_S), int(2 * LIMIT_S)))
        resource.prlimit(pid, resource.RLIMIT_AS, (2**32, 2**32))
        _, status, used = os.wait4(pid, 0)
        out.seek(0)
        err.seek(0)
        said = [file.read().decode("utf-8", "replace") for file in (out, err)]
    seconds = used.ru_utime + used.ru_stime
    return Ended(os.waitstatus_to_exitcode(status), *said, seconds, 1024.0 * used.ru_maxrss)


@contextmanager
def _time_limit() -> Iterator[None]:
    def stop(_signal: int, _frame: FrameType | None) -> None:
        raise TimeUp

    before = signal.signal(signal.SIGPROF, stop)
    signal.setitimer(signal.ITIMER_PROF, LIMIT_S)
    try:
        yield
    finally:
        signal.setitimer(signal.ITIMER_PROF, 0)
        signal.signal(signal.SIGPROF, before)


def _words(command: tuple[str, ...], made: Path, folder: Path) -> list[str]:
    return [
        str(made) if word == INPUT else word.replace("{folder}", str(folder)) for word in command
    ]


def _prints(folder: Path) -> dict[Path, str]:
    """A digest of every regular file, links not followed."""
    return {
        path: hashlib.sha256(path.read_bytes()).hexdigest()
        for path in sorted(folder.rglob("*"))
        if path.is_file() and not path.is_symlink() and path.name != "filler"
    }


def _changed(before: dict[Path, str], after: dict[Path, str]) -> Iterator[str]:
    for path, digest in before.items():
        if after.get(path, digest) != digest:
            yield f"{path.name} was overwritten"


def _processor_s() -> float:
    used = resource.getrusage(resource.RUSAGE_SELF)
    return used.ru_utime + used.ru_stime


def _raised(before: float) -> float:
    """The peak of this process where it has risen since, else 0."""
    peak = _peak_bytes()
    return peak if peak > before else 0.0


def _peak_bytes() -> float:
    return 1024.0 * resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
