"""Long recordings: how fast and in how much memory: ``python -m tests.bench.long_files``.

Every figure is of a fresh process on an hour of audio made on the spot, and stands beside what
cannot be done without: reading the file, and transforming its samples once. ``--minutes`` makes it
shorter, ``--write FILE`` also writes the table as Markdown.
"""

from __future__ import annotations

import argparse
import json
import subprocess
import sys
import tempfile
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import soundfile

from tests.signal.made_taps import Blow, Made, tap_recording

ROOT = Path(__file__).resolve().parents[2]
RATE_HZ = 48_000
MIB = 2**20

PROLOGUE = """
import json, sys, time
import numpy as np
import scipy.linalg, scipy.ndimage, scipy.special
from fieldkit.signal.long_running import power_density_in, read_running_in
from fieldkit.signal.long_taps import cut_from, find_taps_in
from fieldkit.signal.source import open_recording
from fieldkit.signal.welch import segment_length

source = open_recording(Path(sys.argv[1]))
length = segment_length(source.frames, source.rate_hz, 2.0)
idle, wall, cpu = peak(), time.perf_counter(), time.process_time()
"""
EPILOGUE = """
wall, cpu = time.perf_counter() - wall, time.process_time() - cpu
print(json.dumps({"wall_s": wall, "cpu_s": cpu, "bytes": peak() - idle}))
"""
WORK = {
    "read": """
for block in source.blocks(1, 2**18):
    pass
""",
    "transform": """
segment = source.stretch(1, 0, length)
lines = np.empty(length // 2 + 1, complex)
for _ in range(source.frames // length):
    np.fft.rfft(segment, out=lines)
""",
    "density": "power_density_in(source)",
    "picture": "read_running_in(source)",
    "taps": "cut_from(source, 1, find_taps_in(source))",
}
PEAK = """
from pathlib import Path

def peak():
    status = Path("/proc/self/status").read_text().split()
    return int(status[status.index("VmHWM:") + 1]) * 1024
"""
WHOLE = """
import json, os, sys, time
os.environ["OPENBLAS_NUM_THREADS"] = "1"
wall, cpu = time.perf_counter(), time.process_time()
from fieldkit.__main__ import main
idle = peak()
try:
    main()
except SystemExit:
    pass
wall, cpu = time.perf_counter() - wall, time.process_time() - cpu
print(json.dumps({"wall_s": wall, "cpu_s": cpu, "bytes": peak() - idle}), file=sys.stderr)
"""


@dataclass(frozen=True)
class Cost:
    """Of one piece of work in a process of its own."""

    wall_s: float
    cpu_s: float
    bytes: int
    """By which the peak of the process grew."""


def main() -> None:
    """Print the table, and write it where asked."""
    wanted = argparse.ArgumentParser(description=__doc__)
    wanted.add_argument("--minutes", type=int, default=60)
    wanted.add_argument("--write", type=Path)
    chosen = wanted.parse_args()
    with tempfile.TemporaryDirectory() as folder:
        rows = measured(Path(folder), chosen.minutes)
    text = table(rows, chosen.minutes)
    print(text)
    if chosen.write:
        chosen.write.write_text(page(text, chosen.minutes), encoding="utf-8")


def measured(folder: Path, minutes: int) -> dict[str, Cost]:
    """Costs by name."""
    taps = written(folder / "taps.flac", minutes, struck=True)
    running = written(folder / "running.flac", minutes, struck=False)
    rows = {
        name: cost(PROLOGUE + work + EPILOGUE, taps if name == "taps" else running)
        for name, work in WORK.items()
    }
    rows["peaks"] = cost(WHOLE, "peaks", taps)
    rows["running"] = cost(WHOLE, "running", running)
    return rows


def written(path: Path, minutes: int, *, struck: bool) -> Path:
    """A minute over and over in fresh noise: three blows, or a machine with three lines."""
    rng = np.random.default_rng(1)
    count = 60 * RATE_HZ
    if struck:
        modes = (Made(17.3, 0.012, 0.2), Made(41.0, 0.01, 0.12, 0.8), Made(163.0, 0.008, 0.1, 2.0))
        minute = tap_recording(modes, [Blow(4.0), Blow(21.0, 0.5), Blow(43.0, 0.8)], 60.0, RATE_HZ)
    else:
        turns = np.arange(count) / RATE_HZ
        lines = ((24.0, 0.1), (48.0, 0.05), (148.0, 0.02))
        minute = sum(a * np.sin(2 * np.pi * hz * turns) for hz, a in lines)
    with soundfile.SoundFile(path, "w", RATE_HZ, 1, subtype="PCM_16") as file:
        for _ in range(minutes):
            file.write(minute + 3e-4 * rng.standard_normal(count))
    return path


def cost(code: str, *words: object) -> Cost:
    """Of a fresh process; its last line says what it cost."""
    done = subprocess.run(
        [sys.executable, "-c", PEAK + code, *map(str, words)],
        check=True,
        capture_output=True,
        text=True,
        cwd=ROOT,
    )
    said = done.stderr if code is WHOLE else done.stdout
    return Cost(**json.loads(said.strip().splitlines()[-1]))


def table(rows: dict[str, Cost], minutes: int) -> str:
    """The costs, each against what it is to be compared with."""
    least = rows["read"].wall_s + rows["transform"].wall_s
    least_cpu = rows["read"].cpu_s + rows["transform"].cpu_s
    real_s = 60 * minutes
    said = {
        "read": ("reading the file alone", ""),
        "transform": ("the bare transform of its samples", ""),
        "density": (
            "Welch in blocks, half overlap",
            f"{rows['density'].wall_s / least:.2f} x both of these in time, "
            f"{rows['density'].cpu_s / least_cpu:.2f} x in work",
        ),
        "picture": ("spectrum, lines, level, health", f"{real_s / rows['picture'].wall_s:.0f} x"),
        "taps": ("taps found and cut", f"{real_s / rows['taps'].wall_s:.0f} x"),
        "peaks": ("fieldkit peaks", f"{real_s / rows['peaks'].wall_s:.0f} x"),
        "running": ("fieldkit running", f"{real_s / rows['running'].wall_s:.0f} x"),
    }
    lines = [
        f"| {said[name][0]} | {row.wall_s:.2f} | {row.cpu_s:.2f} | {row.bytes / MIB:.0f} | "
        f"{said[name][1]}{' real time' if said[name][1].endswith('x') else ''} |"
        for name, row in rows.items()
    ]
    head = [
        f"| {minutes} min of one channel at 48 kHz, FLAC | time s | processor s | memory MiB | |",
        "|---|---|---|---|---|",
    ]
    return "\n".join([*head, *lines])


def page(text: str, minutes: int) -> str:
    """The table with what it stands on."""
    return (
        "# Long recordings\n\n"
        f"Each line is one fresh process on {minutes} min made for it, 16 bit; memory is by how "
        "much its peak grows over that of the idle process. Written by\n"
        "`python -m tests.bench.long_files --write docs/long-files.md`.\n\n"
        f"{text}\n"
    )


if __name__ == "__main__":
    main()
