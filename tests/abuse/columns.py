"""Hostile text recordings: broken numbers, broken clocks, binary, endless lines, odd encodings."""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial
from pathlib import Path

import numpy as np

from tests.abuse.case import RATE_HZ, READ, Case, taps

COUNT = 4000
CELLS = {
    "nan": "nan",
    "inf": "-inf",
    "huge": "1e308",
    "beyond": "1e999",
    "empty": "",
    "word": "n/a",
    "hex": "0x1F",
    "two points": "1.2.3",
    "many digits": "9" * 5000,
    "minus": "-",
    "date": "2026-02-30",
    "escape": "\x1b[2J\x1b[31m0.1",
    "null": "0.\x001",
    "formula": "=cmd|'/C calc'!A0",
    "wide": "٣.١",
}
HEADERS = {
    "escape": "t (s),\x1b]0;owned\x07acc (m/s2)",
    "markup": "t (s),[bold red]acc[/] (m/s2)",
    "script": "t (s),<script>alert(1)</script>",
    "endless": "t (s)," + "a" * 100_000,
    "right to left": "t (s),\u202eacc (m/s2)",
    "none": "",
    "same twice": "t (s),t (s)",
    "bad unit": "t (s),acc (furlong/fortnight2)",
    "only units": "(s),(m/s2)",
    "quotes": '"t (s),acc',
    "deep quotes": '"' * 4000,
    "many columns": ",".join(f"c{i}" for i in range(5000)),
}
ENCODINGS = ("utf-16", "utf-16-le", "utf-32", "utf-8-sig", "latin-1", "utf-7")


def rows(count: int = COUNT) -> list[str]:
    """Time and acceleration, two taps."""
    values = taps(count / RATE_HZ)[:, 0]
    return [f"{i / RATE_HZ:.6f},{value:.6f}" for i, value in enumerate(values)]


def table(lines: list[str], header: str = "t (s),acc (m/s2)", end: str = "\n") -> bytes:
    """The file as bytes."""
    return end.join([header, *lines, ""]).encode("utf-8", "surrogatepass")


def _cell(text: str) -> bytes:
    lines = rows()
    lines[1200] = f"0.300000,{text}"
    return table(lines)


def _time(change: str) -> bytes:
    t = np.arange(COUNT) / RATE_HZ
    if change == "backwards":
        t = t[::-1]
    elif change == "still":
        t = np.zeros(COUNT)
    elif change == "gap":
        t[COUNT // 2 :] += 100.0
    elif change == "jitter":
        t += np.random.default_rng(1).uniform(0, 1e-3, COUNT)
    elif change == "huge":
        t = t * 1e300
    elif change == "not a number":
        t[7] = np.nan
    values = taps(COUNT / RATE_HZ)[:, 0]
    return table([f"{a!r},{b:.6f}" for a, b in zip(map(float, t), values, strict=True)])


def _write(content: bytes, folder: Path, ending: str = "csv") -> Path:
    path = folder / f"tap.{ending}"
    path.write_bytes(content)
    return path


def contents() -> Iterator[tuple[str, bytes]]:
    """Name and content of each."""
    for name, text in CELLS.items():
        yield f"cell {name}", _cell(text)
    for name, header in HEADERS.items():
        yield f"header {name}", table(rows(), header)
    for change in ("backwards", "still", "gap", "jitter", "huge", "not a number"):
        yield f"clock {change}", _time(change)
    for encoding in ENCODINGS:
        yield encoding, table(rows()).decode().encode(encoding)
    whole = table(rows())
    yield "binary in the middle", whole[:20_000] + bytes(range(256)) * 20 + whole[20_000:]
    yield "nulls at the end", whole + b"\0" * 50_000
    yield "endless line", b"t (s),acc (m/s2)\n" + b"1," * 2_000_000
    yield "endless number", b"t (s),acc (m/s2)\n0,1" + b"0" * 3_000_000
    yield "endless blank", b" " * 3_000_000
    yield "many empty lines", b"\n" * 2_000_000
    yield "header only", b"t (s),acc (m/s2)\n"
    yield "one row", b"t (s),acc (m/s2)\n0,1\n"
    yield "no newline", b"0.1"
    yield "carriage returns", table(rows(), end="\r")
    yield "mixed endings", whole.replace(b"\n", b"\r\n", 1000)
    yield "decimal commas", whole.replace(b",", b";").replace(b".", b",")
    yield "more columns on the way", whole + b"1.1,0.1,0.2,0.3\n" * 500
    yield "fewer columns on the way", whole + b"1.1\n" * 500
    yield "512 columns", table([",".join(["0.5"] * 512)] * 60, "")
    yield "comments only", b"# nothing\n" * 5000


def cases() -> Iterator[Case]:
    """All of them."""
    for name, content in contents():
        yield Case(f"csv {name}", partial(_write, content), READ)
