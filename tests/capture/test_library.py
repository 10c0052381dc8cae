"""No PortAudio, no input, a broken set-up: a sentence with what to do, and nothing else."""

from __future__ import annotations

import os
import platform
import subprocess
import sys

import pytest

from fieldkit.capture.library import how_to_install
from tests.capture.rig import require

LIST = """
from fieldkit.capture.devices import list_inputs
from fieldkit.errors import Refusal
try:
    print(list_inputs())
except Refusal as refusal:
    print(refusal)
"""
NO_LIBRARY = """
import ctypes.util
ctypes.util.find_library = lambda name: None
"""


def run(code, **environment):
    ran = subprocess.run(
        [sys.executable, "-c", code],
        env=os.environ | environment,
        capture_output=True,
        text=True,
        timeout=120,
        check=False,
    )
    assert ran.returncode == 0, ran.stderr
    assert ran.stderr == ""
    return ran.stdout


@pytest.mark.skipif(platform.system() != "Linux", reason="other wheels carry PortAudio")
def test_a_missing_library_is_told_with_the_command_that_installs_it(tmp_path):
    (tmp_path / "sitecustomize.py").write_text(NO_LIBRARY)
    told = run(LIST, PYTHONPATH=f"{tmp_path}{os.pathsep}{os.environ.get('PYTHONPATH', '')}")
    assert told == f"PortAudio, which reads the inputs, is missing; {how_to_install()}\n"


def test_a_computer_without_input_is_told(tmp_path):
    require()
    (tmp_path / "asound.conf").write_text("pcm.!default { type empty }\nctl.!default 0\n")
    told = run(LIST, ALSA_CONFIG_PATH=str(tmp_path / "asound.conf"))
    assert told.startswith("this computer has no audio input; plug in")


@pytest.mark.skipif(platform.system() != "Linux", reason="ALSA is Linux's")
def test_an_alsa_set_up_that_aborts_portaudio_does_not_abort_us(tmp_path):
    require()
    (tmp_path / "asound.conf").write_text("# no pcm.default\n")
    told = run(LIST, ALSA_CONFIG_PATH=str(tmp_path / "asound.conf"))
    assert told.startswith("the audio set-up of this computer stops PortAudio from starting")


@pytest.mark.parametrize(
    ("system", "release", "command"),
    [
        ("Linux", {"ID": "debian"}, "sudo apt install libportaudio2"),
        ("Linux", {"ID": "mint", "ID_LIKE": "ubuntu debian"}, "sudo apt install libportaudio2"),
        ("Linux", {"ID": "fedora"}, "sudo dnf install portaudio"),
        ("Linux", {"ID": "rocky", "ID_LIKE": "rhel centos fedora"}, "sudo dnf install portaudio"),
        ("Linux", {"ID": "arch"}, "sudo pacman -S portaudio"),
        ("Linux", {"ID": "opensuse-leap"}, "sudo zypper install libportaudio2"),
        ("Linux", {}, "install the package portaudio"),
        ("Darwin", {}, "pip install --force-reinstall sounddevice"),
        ("Windows", {}, "pip install --force-reinstall sounddevice"),
    ],
)
def test_each_system_is_told_its_own_command(monkeypatch, system, release, command):
    monkeypatch.setattr(platform, "system", lambda: system)
    monkeypatch.setattr(platform, "freedesktop_os_release", lambda: release)
    assert command in how_to_install()
