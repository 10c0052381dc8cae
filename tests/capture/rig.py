"""Real audio without a sound card: a PulseAudio null sink, and a JACK server with a dummy driver.

Each bench is a server of its own in a folder of its own. A server dies with the process that
started it, whatever way that ends.
"""

from __future__ import annotations

import os
import shutil
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
import pytest
import soundfile

RATE_HZ = 48000
LEAD_S = 0.5
"""Silence at the start of what is played: the first frames of a player may be cut."""
GENEROUS_S = 60.0
JACK_READY_S, JACK_ANSWER_S = 20.0, 5.0
JACK_NAME = "fieldkit-rig"
"""Always the same: JACK knows eight servers at most, and forgets one that was killed only when
another of its name starts."""


def require(*programs: str) -> None:
    """Skip where a program is missing; fail where FIELDKIT_REQUIRE_AUDIO is set."""
    missing = [program for program in programs if shutil.which(program) is None]
    if not missing and not portaudio_is_here():
        missing = ["libportaudio2"]
    if not missing:
        return
    reason = f"real audio needs {', '.join(missing)}"
    if os.environ.get("FIELDKIT_REQUIRE_AUDIO") == "1":
        pytest.fail(reason)
    pytest.skip(reason)


def portaudio_is_here() -> bool:
    """Whether the library can be found."""
    from ctypes.util import find_library

    return find_library("portaudio") is not None


def until(condition, within_s: float = GENEROUS_S, *, why: str = ""):
    """Wait for a condition; its value, or a failure that says what was waited for."""
    end = time.monotonic() + within_s
    while not (value := condition()):
        if time.monotonic() > end:
            pytest.fail(f"waited {within_s:.0f} s in vain: {why or condition}")
        time.sleep(0.01)
    return value


@dataclass
class Bench:
    """A PulseAudio server whose one input hears what is played on its one output."""

    folder: Path
    server: subprocess.Popen | None = None
    players: list[subprocess.Popen] = field(default_factory=list)

    @property
    def environment(self) -> dict[str, str]:
        """What leads a process, and PortAudio in it, to this server."""
        return {
            "PULSE_SERVER": f"unix:{self.folder}/native",
            "PULSE_RUNTIME_PATH": f"{self.folder}/rt",
            "PULSE_STATE_PATH": f"{self.folder}/st",
            "PULSE_COOKIE": f"{self.folder}/cookie",
            "ALSA_CONFIG_PATH": f"{self.folder}/asound.conf",
        }

    def begin(self) -> None:
        """Start the server, or start it again after it was killed."""
        server = f"unix:{self.folder}/native"
        (self.folder / "asound.conf").write_text(
            f'pcm.bench {{ type pulse server "{server}" device "bench.monitor" }}\n'
            'pcm.default "bench"\n'
        )
        (self.folder / "native").unlink(missing_ok=True)
        protocol = f"auth-anonymous=1 auth-cookie-enabled=0 socket={self.folder}/native"
        sink = f"sink_name=bench norewinds=1 format=s16le rate={RATE_HZ} channels=2"
        self.server = dying_with_us(
            [
                "pulseaudio", "-n", "--daemonize=no", "--use-pid-file=no", "--exit-idle-time=-1",
                "--realtime=no", "--high-priority=no", "--disable-shm=yes", "--log-target=stderr",
                "-L", f"module-native-protocol-unix {protocol}",
                "-L", f"module-null-sink {sink}",
            ],
            self.environment,
        )  # fmt: skip
        until(lambda: self.control("info") == 0, why="PulseAudio answers")

    def control(self, *words: str) -> int:
        """Run pactl."""
        return subprocess.run(
            ["pactl", *words],
            env=os.environ | self.environment,
            capture_output=True,
            timeout=GENEROUS_S,
            check=False,
        ).returncode

    def play(self, samples: np.ndarray) -> None:
        """Begin to play int16 samples (n, channels), after LEAD_S of silence."""
        lead = np.zeros((round(LEAD_S * RATE_HZ), samples.shape[1]), np.int16)
        path = self.folder / f"played-{len(self.players)}.wav"
        soundfile.write(path, np.concatenate([lead, samples]), RATE_HZ, subtype="PCM_16")
        self.players.append(
            dying_with_us(["paplay", "--device=bench", str(path)], self.environment)
        )

    def kill(self) -> None:
        """The device is torn out."""
        self.server.kill()
        self.server.wait()

    def freeze(self) -> None:
        """The server stops answering."""
        self.server.send_signal(signal.SIGSTOP)

    def thaw(self) -> None:
        """It answers again."""
        self.server.send_signal(signal.SIGCONT)

    def stall(self, stalled: bool) -> None:
        """The input delivers nothing, or delivers again."""
        assert self.control("suspend-sink", "bench", "1" if stalled else "0") == 0

    def end(self) -> None:
        """End everything that was started."""
        for process in [*self.players, self.server]:
            put_down(process)


def dying_with_us(
    command: list[str], environment: dict[str, str], *, signal_name: str = "KILL"
) -> subprocess.Popen:
    """A process that gets a signal when this one ends."""
    return subprocess.Popen(
        ["setpriv", "--pdeathsig", signal_name, *command],
        env=os.environ | environment,
        stdin=subprocess.DEVNULL,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
    )


def put_down(process: subprocess.Popen | None) -> None:
    """End a process, also one that is stopped."""
    if process is None or process.poll() is not None:
        return
    process.send_signal(signal.SIGCONT)
    process.terminate()
    try:
        process.wait(20.0)
    except subprocess.TimeoutExpired:
        process.kill()
        process.wait()


@contextmanager
def pulse_bench(folder: Path) -> Iterator[Bench]:
    """A bench in a folder, ended whatever happens."""
    require("pulseaudio", "pactl", "paplay", "setpriv")
    folder.mkdir(parents=True, exist_ok=True)
    made = Bench(folder)
    try:
        made.begin()
        yield made
    finally:
        made.end()


def end_portaudio() -> None:
    """PortAudio lets go of everything, so that the next bench is found."""
    if "sounddevice" not in sys.modules:
        return
    from fieldkit.capture.library import _open_streams, portaudio

    until(lambda: not _open_streams, why="all streams are closed")
    with portaudio() as sd:
        while sd._initialized:
            sd._terminate()


@contextmanager
def jack_bench() -> Iterator[dict[str, str]]:
    """The environment of a JACK server with a dummy driver, ended whatever happens.

    On a busy computer it may come up stuck: then its clients fail, and another is to be started.
    """
    require("jackd", "setpriv")
    environment = {
        "JACK_DEFAULT_SERVER": JACK_NAME,
        "JACK_NO_START_SERVER": "1",
        "JACK_NO_AUDIO_RESERVATION": "1",
    }
    driver = ["-d", "dummy", "-r", str(RATE_HZ), "-p", "512", "-C", "2", "-P", "2"]
    server = dying_with_us(
        ["jackd", "-n", JACK_NAME, "-r", "-t", "20000", *driver], environment, signal_name="TERM"
    )
    try:
        ready = time.monotonic() + JACK_READY_S
        while not jack_answers(environment) and server.poll() is None:
            if time.monotonic() > ready:
                break
            time.sleep(0.05)
        yield environment
    finally:
        put_down(server)


def jack_answers(environment: dict[str, str]) -> bool:
    """Whether the server takes clients."""
    waiting = ["jack_wait", "-s", environment["JACK_DEFAULT_SERVER"], "-c"]
    try:
        ran = subprocess.run(
            waiting,
            env=os.environ | environment,
            capture_output=True,
            timeout=JACK_ANSWER_S,
            check=False,
        )
    except subprocess.TimeoutExpired:
        return False
    return b"running" in ran.stdout and b"not" not in ran.stdout
