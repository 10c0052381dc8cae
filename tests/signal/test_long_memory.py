"""Memory does not grow with the length of a recording."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
import soundfile

from tests.signal.made_taps import Blow, Made, tap_recording

RATE_HZ = 8000
MIB = 2**20

WORK = """
import sys
from pathlib import Path
import scipy.linalg, scipy.ndimage, scipy.special
from fieldkit.signal.long_running import read_running_in
from fieldkit.signal.long_taps import cut_from, find_taps_in
from fieldkit.signal.source import open_recording

def peak():
    status = Path("/proc/self/status").read_text().split()
    return int(status[status.index("VmHWM:") + 1]) * 1024

before = peak()
source = open_recording(Path(sys.argv[1]))
if sys.argv[2] == "taps":
    search = find_taps_in(source)
    assert len(search.taps) == source.duration_s // 30, len(search.taps)
    assert cut_from(source, 1, search)
else:
    assert read_running_in(source).lines
print(peak() - before)
"""


def written(path: Path, minutes: int) -> Path:
    """Half a minute with one blow and a hum, over and over, in fresh noise."""
    rng = np.random.default_rng(3)
    modes = (Made(17.3, 0.03, 0.5), Made(63.0, 0.02, 0.3, 0.8))
    half_minute = tap_recording(modes, [Blow(12.0)], 30.0, RATE_HZ)
    half_minute += 0.01 * np.sin(2 * np.pi * 50 * np.arange(len(half_minute)) / RATE_HZ)
    with soundfile.SoundFile(path, "w", RATE_HZ, 1, subtype="PCM_16") as file:
        for _ in range(2 * minutes):
            file.write(half_minute + 1e-3 * rng.standard_normal(len(half_minute)))
    return path


def growth(path: Path, work: str) -> int:
    """Bytes by which the peak of a fresh process grows while it reads a recording."""
    done = subprocess.run(
        [sys.executable, "-c", WORK, str(path), work], check=True, capture_output=True, text=True
    )
    return int(done.stdout)


@pytest.mark.skipif(sys.platform != "linux", reason="reads the peak from /proc")
@pytest.mark.parametrize("work", ["taps", "running"])
def test_twenty_minutes_need_no_more_memory_than_five(tmp_path, work):
    """Twenty minutes alone would be 73 MiB if they were held."""
    five = growth(written(tmp_path / "five.flac", 5), work)
    twenty = growth(written(tmp_path / "twenty.flac", 20), work)
    assert twenty - five < 12 * MIB
    assert twenty < 60 * MIB
