"""One hostile input: how it is made, and which commands it is put before."""

from __future__ import annotations

from collections.abc import Callable
from contextlib import AbstractContextManager, nullcontext
from dataclasses import dataclass
from pathlib import Path

import numpy as np

INPUT = "{}"
"""Stands for the input among the words of a command."""
READ = (("peaks", INPUT), ("running", INPUT))
RATE_HZ = 4000

JOB = """\
fieldkit = 1
title = "Glycol booster"

[pipe]
size = "NPS 3"
schedule = "40"
material = "carbon steel"

[contents]
name = "water"

[[leg]]
direction = "+x"
length = "4.2 m"

[[support]]
at = "0 m"
kind = "anchor"

[[support]]
at = "4.2 m"
kind = "clamp"

[[excitation]]
name = "pump"
speed = "1480 rpm"

[[measured]]
frequency = "24.1 Hz"
direction = "vertical"
"""
TAP = """
[[recording]]
file = "tap.wav"
kind = "tap"
sensitivity = "100 mV/g"
full_scale = "1.4 V"
direction = "vertical"
at = "1.9 m"
"""


def undisturbed(_: Path) -> AbstractContextManager[None]:
    """Nothing happens around the command."""
    return nullcontext()


@dataclass(frozen=True)
class Case:
    """An input, or a family member of one."""

    name: str
    build: Callable[[Path], Path]
    """Makes it in an empty folder and returns what the commands are given."""
    commands: tuple[tuple[str, ...], ...]
    around: Callable[[Path], AbstractContextManager[None]] = undisturbed
    """What happens while a command runs, such as a full disk; given the folder."""
    alone: bool = True
    """Whether it can also run in a process of its own."""


def taps(seconds: float = 6.0, rate_hz: int = RATE_HZ, columns: int = 1) -> np.ndarray:
    """(n, columns): two decays at 24 Hz in a little noise, full scale 1."""
    t = np.arange(int(seconds * rate_hz)) / rate_hz
    signal = 0.002 * np.random.default_rng(1).standard_normal((len(t), columns))
    for start in (0.15 * seconds, 0.55 * seconds):
        after = np.clip(t - start, 0, None)
        decay = np.where(t >= start, np.exp(-0.02 * 2 * np.pi * 24 * after), 0.0)
        signal += (0.5 * decay * np.sin(2 * np.pi * 24 * after))[:, None]
    return np.clip(signal, -0.99, 0.99)
