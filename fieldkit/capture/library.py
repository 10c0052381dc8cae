"""The one place that imports sounddevice: PortAudio started, listed anew and ended safely.

PortAudio is not safe to be called from two threads at once, so every call except a stream's own
callback is made inside ``portaudio()``. It may wait as long as the audio server does: never call it
from a thread that must answer.
"""

from __future__ import annotations

import atexit
import platform
import subprocess
import sys
import threading
from collections.abc import Iterator
from contextlib import ExitStack, contextmanager, suppress
from typing import Any

from fieldkit.capture.quiet import libraries_kept_quiet
from fieldkit.errors import Refusal

ANSWER_WITHIN_S = 10.0

_APT, _DNF = "sudo apt install libportaudio2", "sudo dnf install portaudio"
_INSTALL = {
    "debian": _APT,
    "ubuntu": _APT,
    "fedora": _DNF,
    "rhel": _DNF,
    "arch": "sudo pacman -S portaudio",
    "suse": "sudo zypper install libportaudio2",
    "alpine": "sudo apk add portaudio",
}

_calls = threading.RLock()
_open_streams: dict[int, ExitStack] = {}
_ready = False


@contextmanager
def portaudio(*, answer_within_s: float = ANSWER_WITHIN_S) -> Iterator[Any]:
    """The sounddevice module, for the calling thread alone.

    Raises Refusal where PortAudio is missing, cannot start, or another call is stuck in it.
    """
    if not _calls.acquire(timeout=answer_within_s):
        raise Refusal(
            "the audio system of this computer does not answer",
            "wait half a minute, or restart its audio server",
        )
    try:
        with libraries_kept_quiet():
            yield _module()
    finally:
        _calls.release()


def list_anew(sd: Any) -> bool:
    """Start PortAudio again, so that devices that came or went are seen; call inside portaudio().

    False, and nothing done, while a stream is open: it would be torn down.
    """
    if _open_streams:
        return False
    while sd._initialized:
        sd._terminate()
    sd._initialize()
    return True


def hold(stream: object) -> None:
    """Note that a stream is open, and keep the libraries quiet as long as it is."""
    quiet = ExitStack()
    quiet.enter_context(libraries_kept_quiet())
    _open_streams[id(stream)] = quiet


def let_go(stream: object) -> None:
    """Note that a stream is closed."""
    quiet = _open_streams.pop(id(stream), None)
    if quiet is not None:
        quiet.close()


def how_to_install() -> str:
    """How PortAudio gets onto this computer."""
    if platform.system() in ("Windows", "Darwin"):
        return "install it with: python -m pip install --force-reinstall sounddevice"
    known: dict[str, str] = {}
    with suppress(OSError):
        known = platform.freedesktop_os_release()
    families = [known.get("ID", ""), *known.get("ID_LIKE", "").split()]
    for family in families:
        for name, command in _INSTALL.items():
            if family.startswith(name) or (name == "suse" and "suse" in family):
                return f"install it with: {command}"
    return "install the package portaudio (libportaudio2) of this system"


def _module() -> Any:
    global _ready
    if not _ready:
        _check_starts()
    try:
        import sounddevice as sd
    except (OSError, ImportError):
        raise Refusal("PortAudio, which reads the inputs, is missing", how_to_install()) from None
    if not _ready:
        atexit.unregister(sd._exit_handler)
        atexit.register(_end, sd)
        _ready = True
    return sd


def _check_starts() -> None:
    """Start PortAudio in another process first: a broken ALSA set-up aborts the one it runs in."""
    if platform.system() != "Linux" or "sounddevice" in sys.modules:
        return
    command = [sys.executable, "-c", "import sounddevice"]
    try:
        status = subprocess.run(
            command, capture_output=True, timeout=ANSWER_WITHIN_S, check=False
        ).returncode
    except subprocess.TimeoutExpired:
        raise Refusal(
            "the audio system of this computer does not answer", "restart its audio server"
        ) from None
    if status < 0:
        raise Refusal(
            "the audio set-up of this computer stops PortAudio from starting",
            "define pcm.default in the ALSA configuration, or install libasound2-data",
        )


def _end(sd: Any) -> None:
    """End PortAudio with the program, unless a stream is stuck: then the system cleans up."""
    if _open_streams or not _calls.acquire(timeout=0.5):
        return
    with libraries_kept_quiet(), suppress(Exception):
        while sd._initialized:
            sd._terminate()
