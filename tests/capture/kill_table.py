"""Kill recordings at random moments, and see how far each can be read.

python -m tests.capture.kill_table --times 50
"""

from __future__ import annotations

import argparse
import os
import subprocess
import sys
import tempfile
import threading
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import soundfile

from fieldkit.capture.clock import now_s
from fieldkit.capture.sidecar import read_info
from fieldkit.signal.recording import load
from tests.capture.rig import RATE_HZ, Bench, pulse_bench, until

EARLIEST_S, LATEST_S = 0.7, 3.5
MOST_LOST_S = 0.5
TO_DISK_S = 0.25
"""Of it: from the audio system's hands to the disk. The rest waits in the audio system."""

RECORDER = """
import os, sys, threading
from pathlib import Path
from fieldkit.capture.clock import now_s
from fieldkit.capture.devices import find_input, list_inputs
from fieldkit.capture.portaudio import PortAudioSource
from fieldkit.capture.session import Session
from fieldkit.capture.setup import ChannelSetup

start = PortAudioSource.start
def noted(source, deliver, ended):
    frames = 0
    def counted(block):
        nonlocal frames
        deliver(block)
        frames += len(block.samples)
        os.write(1, f"{now_s()} {frames}\\n".encode())
    start(source, counted, ended)
PortAudioSource.start = noted

source = PortAudioSource(
    find_input("bench", list_inputs(check_rates=False)), rate_hz=48000, channels=2
)
import sounddevice
start_stream = sounddevice.InputStream.start
def timed(stream):
    os.write(1, f"{now_s()} 0\\n".encode())
    start_stream(stream)
sounddevice.InputStream.start = timed
session = Session(source)
session.record(Path(sys.argv[1]), (ChannelSetup(), ChannelSetup()))
session.start()
threading.Event().wait()
"""
"""Says when the input was told to start, which no frame in the file is older than: what is found
lost then counts what waited in the audio server and in PortAudio too, and never too little. Then,
for every block, when it arrived and how many frames had arrived by then."""


@dataclass(frozen=True)
class Killed:
    """One recording that was killed."""

    at_s: float
    """After the input was told to start."""
    arrived_s: float
    """What the audio system had handed over TO_DISK_S before the kill."""
    readable_s: float
    """By libsndfile alone."""
    loaded_s: float
    """By fieldkit."""
    whole: bool
    """Whether all that can be read is what was played, bit for bit."""
    described: bool
    """Whether the sidecar can be read."""

    @property
    def lost_s(self) -> float:
        """Before the kill, and not readable."""
        return self.at_s - min(self.readable_s, self.loaded_s)

    @property
    def kept(self) -> bool:
        """Whether it is readable up to MOST_LOST_S before the kill.

        Where the computer is so busy that the audio system itself is behind: whether all is
        readable that it had handed over TO_DISK_S before the kill.
        """
        wanted_s = self.at_s - MOST_LOST_S
        return min(self.readable_s, self.loaded_s) >= min(wanted_s, self.arrived_s)


def played_noise(seconds: float = 60.0) -> np.ndarray:
    """Noise (n, 2) in which no stretch is like another."""
    rng = np.random.default_rng(1)
    return rng.integers(-20000, 20000, (round(seconds * RATE_HZ), 2)).astype(np.int16)


def kills(bench: Bench, folder: Path, times: int, seed: int) -> Iterator[Killed]:
    """Record what the bench plays, in another process that is killed, so many times."""
    rng = np.random.default_rng(seed)
    played = played_noise()
    for number in range(times):
        bench.play(played)
        yield one_kill(bench, folder / f"killed-{number}.wav", rng.uniform(EARLIEST_S, LATEST_S))
        bench.players[-1].kill()
        bench.players[-1].wait()


def one_kill(bench: Bench, path: Path, after_s: float) -> Killed:
    """Record, and kill the recorder a while after its input was told to start."""
    recorder = subprocess.Popen(
        ["setpriv", "--pdeathsig", "KILL", sys.executable, "-c", RECORDER, str(path)],
        env=os.environ | bench.environment,
        stdout=subprocess.PIPE,
        text=True,
    )
    arrivals: list[tuple[float, int]] = []
    listening = threading.Thread(target=read_arrivals, args=(recorder, arrivals))
    listening.start()
    try:
        until(lambda: len(arrivals) > 1, why="frames arrive")
        began_s = arrivals[0][0]
        until(lambda: now_s() >= began_s + after_s)
    finally:
        killed_s = now_s()
        recorder.kill()
        recorder.wait()
        listening.join()
    samples, _ = soundfile.read(path, dtype="int32", always_2d=True)
    early = [frames for at_s, frames in arrivals if at_s <= killed_s - TO_DISK_S]
    return Killed(
        at_s=killed_s - began_s,
        arrived_s=max(early, default=0) / RATE_HZ,
        readable_s=len(samples) / RATE_HZ,
        loaded_s=load(path).duration_s,
        whole=is_whole(samples >> 16),
        described=read_info(path) is not None,
    )


def read_arrivals(recorder: subprocess.Popen, into: list[tuple[float, int]]) -> None:
    """Take down what a recorder says, until it says no more."""
    for line in recorder.stdout:
        at_s, frames = line.split()
        into.append((float(at_s), int(frames)))
    recorder.stdout.close()


def is_whole(recorded: np.ndarray) -> bool:
    """Whether it is silence, then an unbroken stretch of the noise."""
    played = played_noise()
    sounding = np.flatnonzero(recorded.any(axis=1))
    if not len(sounding):
        return True
    heard = recorded[sounding[0] :]
    starts = np.flatnonzero((played == heard[0]).all(axis=1))
    return any(np.array_equal(played[i : i + len(heard)], heard) for i in starts)


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--times", type=int, default=50)
    parser.add_argument("--seed", type=int, default=0)
    asked = parser.parse_args()
    print("killed after   readable until   lost     bit-exact  sidecar")
    lost = []
    with tempfile.TemporaryDirectory() as name, pulse_bench(Path(name) / "bench") as bench:
        for row in kills(bench, Path(name), asked.times, asked.seed):
            lost.append(row.lost_s)
            print(
                f"{row.at_s:9.3f} s {row.readable_s:14.3f} s {row.lost_s:8.3f} s"
                f"   {'yes' if row.whole else 'NO':9s}  {'yes' if row.described else 'NO'}",
                flush=True,
            )
    print(f"{len(lost)} kills: lost {np.median(lost):.3f} s in the middle, {max(lost):.3f} s worst")


if __name__ == "__main__":
    main()
