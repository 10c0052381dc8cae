"""What the capture screens are given: inputs, time, presets, and a thread that may wait."""

from __future__ import annotations

import threading
from collections.abc import Callable
from contextlib import suppress
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from textual.message import Message
from textual.message_pump import MessagePump

from fieldkit.capture.devices import Input, list_inputs

if TYPE_CHECKING:
    from fieldkit.capture.practice import Pace


@dataclass(frozen=True)
class Bench:
    """Where inputs, time and presets come from."""

    list_inputs: Callable[[], tuple[Input, ...]] = list_inputs
    """May take seconds; raises Refusal where there is no input."""
    pace: Pace | None = None
    """What the practice rig keeps time with; None: the clock on the wall."""
    presets_path: Path | None = None
    """None: the user's own file."""


def in_background(target: MessagePump, work: Callable[[], Message]) -> None:
    """Do what may wait in a thread of its own, and post what it gives.

    The thread is none of the event loop's: a frozen audio system must not keep the app from
    leaving.
    """

    def run() -> None:
        message = work()
        with suppress(RuntimeError):  # the app has left meanwhile
            target.post_message(message)

    threading.Thread(target=run, name="capture screen", daemon=True).start()
