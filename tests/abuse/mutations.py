"""Good inputs with a few random changes: bytes, pieces and lines, from one seed."""

from __future__ import annotations

import random
from collections.abc import Iterator
from functools import partial
from pathlib import Path

from tests.abuse import columns
from tests.abuse.audio import wav
from tests.abuse.case import INPUT, JOB, TAP, Case

SHORT_S = 2.0
WORDS = (
    b"",
    b"\0",
    b"\xff",
    b"nan",
    b"1e999",
    b"-",
    b"[",
    b"]",
    b'"',
    b"'''",
    b"=",
    b"\n",
    b",",
    b";",
    b"#",
    b"{",
    b"}",
    b"\x1b[2J",
    b"9" * 50,
    b"rigid",
    b"unknown",
    b"0 m",
    b"\xe2\x80\xae",
)


def mutated(content: bytes, rng: random.Random, most: int = 6) -> bytes:
    """With one to ``most`` changes, near the start more often than not."""
    changed = bytearray(content)
    for _ in range(rng.randint(1, most)):
        size = len(changed)
        at = int(size * rng.random() ** rng.choice((1, 4)))
        length = rng.choice((1, 1, 2, 4, 16, 64))
        kind = rng.randrange(6)
        if kind == 0:
            changed[at : at + 1] = bytes([rng.randrange(256)])
        elif kind == 1:
            del changed[at : at + length]
        elif kind == 2:
            changed[at:at] = rng.choice(WORDS)
        elif kind == 3:
            changed[at : at + length] = rng.choice(WORDS)
        elif kind == 4:
            other = rng.randrange(size + 1)
            changed[at:at] = changed[other : other + 8 * length]
        else:
            _swap_lines(changed, rng)
    return bytes(changed)


def _swap_lines(content: bytearray, rng: random.Random) -> None:
    lines = bytes(content).split(b"\n")
    a, b = rng.randrange(len(lines)), rng.randrange(len(lines))
    lines[a], lines[b] = lines[b], lines[a]
    content[:] = b"\n".join(lines)


def _write(content: bytes, name: str, folder: Path) -> Path:
    (folder / "tap.wav").write_bytes(wav(SHORT_S))
    path = folder / name
    path.write_bytes(content)
    return path


def cases(seed: int, count: int) -> Iterator[Case]:
    """``count`` of each kind: recordings as audio and as text, jobs."""
    rng = random.Random(seed)
    table = columns.table(columns.rows(1200))
    job = (JOB + TAP).encode()
    for i in range(count):
        peaks, span = (("peaks", INPUT),), (("span", INPUT),)
        header = wav(SHORT_S)
        yield Case(
            f"mutated wav {i}",
            partial(_write, mutated(header[:200], rng) + header[200:], "mutated.wav"),
            peaks,
        )
        yield Case(f"mutated csv {i}", partial(_write, mutated(table, rng), "mutated.csv"), peaks)
        yield Case(f"mutated job {i}", partial(_write, mutated(job, rng), "job.toml"), span)
