"""Long recordings: how fast and in how much memory: ``python -m tests.bench.long_files``.

Every figure is of a fresh process on an hour of audio made on the spot, and stands beside what
cannot be done without: reading the file, and transforming its samples once. ``--minutes`` makes it
shorter, ``--write FILE`` also writes the table as Markdown.
"""

from __future__ import annotations

import tempfile
from collections.abc import Sequence
from pathlib import Path

import numpy as np
import soundfile

from fieldkit.signal.integration import CORNER_HZ
from fieldkit.signal.long_running import BLOCK_SAMPLES, power_density_in
from fieldkit.signal.source import RecordingSource, open_recording
from fieldkit.signal.welch import segment_length
from tests.bench.asking import parser
from tests.bench.measuring import Cost, cost, in_turn, ratio
from tests.bench.rows import BY_CLOCK, Growth, Row
from tests.signal.made_taps import Blow, Made, tap_recording

RATE_HZ = 48_000
MIB = 2**20
LEAST = "reading the file and one bare transform of its samples"
WARM = (
    "one process for all, where memory once given is kept: a bare transform then takes half the "
    "time it takes in a fresh one, and half overlap alone is two of them"
)

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


def main() -> None:
    """Print the table, and write it where asked."""
    chosen = parser("tests.bench.long_files", __doc__, "minutes", "write").parse_args()
    with tempfile.TemporaryDirectory() as folder:
        costs = measured(Path(folder), chosen.minutes)
    text = table(costs, chosen.minutes)
    print(text)
    if chosen.write:
        chosen.write.write_text(page(text, chosen.minutes), encoding="utf-8")


def rows(minutes: int, runs: int) -> list[Row]:
    """Welch beside reading and one transform: time, and memory beside holding the samples."""
    with tempfile.TemporaryDirectory() as folder:
        path = written(Path(folder) / "running.flac", 60 * minutes, struck=False)
        works = {
            name: PROLOGUE + WORK[name] + EPILOGUE for name in ("density", "read", "transform")
        }
        found = [{name: cost(code, path) for name, code in works.items()} for _ in range(runs)]
    audio = f"{minutes} min of 48 kHz audio"
    held_mib = 60 * minutes * RATE_HZ * 8 / MIB
    peak_mib = float(np.median([costs["density"].bytes for costs in found])) / MIB
    return [
        _both(f"Welch in blocks over {audio}", [_times(costs, "cpu_s") for costs in found]),
        _both(
            f"Welch in blocks over {audio}", [_times(costs, "wall_s") for costs in found], BY_CLOCK
        ),
        Row(
            f"peak memory of Welch over {audio}",
            peak_mib,
            held_mib,
            peak_mib / held_mib,
            "its samples held at once, 8 bytes each (worked out, not measured)",
            "MiB over the idle process",
        ),
    ]


def _times(costs: dict[str, Cost], which: str) -> tuple[float, float]:
    """Of Welch, and of reading and transforming together."""
    seconds = {name: float(getattr(one, which)) for name, one in costs.items()}
    return seconds["density"], seconds["read"] + seconds["transform"]


def _both(name: str, times: Sequence[tuple[float, float]], how: str = "of processor") -> Row:
    ours, theirs = np.array(times).T
    medians = float(np.median(ours)), float(np.median(theirs))
    return Row(name, *medians, ratio(ours, theirs), LEAST, f"s {how}", "aim: under 1.3")


def growth(lengths_s: Sequence[int], runs: int) -> list[Row]:
    """Welch against the length of the recording, in this process."""
    times = [_at_length(seconds, runs if seconds < 600 else 1) for seconds in lengths_s]
    ours, theirs = np.array(times).T
    name, unit = "Welch in blocks", "s of processor"
    return Growth(name, lengths_s, "s of audio", ours, theirs, LEAST, unit, WARM).rows()


def _at_length(seconds: int, runs: int) -> tuple[float, float]:
    with tempfile.TemporaryDirectory() as folder:
        source = open_recording(written(Path(folder) / "running.flac", seconds, struck=False))
        spent_s = in_turn(
            {"ours": lambda: power_density_in(source), "least": lambda: _least(source)},
            runs,
            warm=seconds < 600,
        )
    return float(np.median(spent_s["ours"])), float(np.median(spent_s["least"]))


def _least(source: RecordingSource) -> None:
    """Read every block; transform as many samples once."""
    for _ in source.blocks(1, BLOCK_SAMPLES):
        pass
    length = segment_length(source.frames, source.rate_hz, CORNER_HZ)
    segment = source.stretch(1, 0, length)
    for _ in range(source.frames // length):
        np.fft.rfft(segment)


def measured(folder: Path, minutes: int) -> dict[str, Cost]:
    """Costs by name."""
    taps = written(folder / "taps.flac", 60 * minutes, struck=True)
    running = written(folder / "running.flac", 60 * minutes, struck=False)
    rows = {
        name: cost(PROLOGUE + work + EPILOGUE, taps if name == "taps" else running)
        for name, work in WORK.items()
    }
    rows["peaks"] = cost(WHOLE, "peaks", taps, said_on_stderr=True)
    rows["running"] = cost(WHOLE, "running", running, said_on_stderr=True)
    return rows


def written(path: Path, seconds: int, *, struck: bool) -> Path:
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
        for begin in range(0, seconds, 60):
            count = RATE_HZ * min(60, seconds - begin)
            file.write(minute[:count] + 3e-4 * rng.standard_normal(count))
    return path


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
