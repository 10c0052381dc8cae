"""What a source of samples is, be it an input of the machine or a simulated one."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

Samples = NDArray[np.float32]


@dataclass(frozen=True, slots=True)
class Block:
    """Some frames in a row, and what was lost before them."""

    first_frame: int
    """Frames delivered before these since the source started; what was lost is not counted."""
    samples: Samples
    """(n, channels), full scale 1; nobody writes into it."""
    lost_frames: int | None = 0
    """Lost directly before the first frame; None: some, nobody knows how many."""
    cause: str = ""
    """Why they were lost, as in ``the input overflowed``."""
    exact: bool = True
    """Whether the number is counted, not estimated with the clock."""
    within_frames: int = 0
    """The loss may lie up to so many frames earlier."""


@dataclass(frozen=True)
class SourceEnd:
    """Why a source ended by itself."""

    kind: str
    """``vanished``, ``stalled``, ``frozen``, ``failed`` or ``finished`` (nothing more to come)."""
    message: str
    """For the user, the beginning of a sentence."""


Deliver = Callable[[Block], None]
"""Takes a block from any thread at once; never waits."""
Ended = Callable[[SourceEnd], None]


class Source(Protocol):
    """A source of samples.

    One that ended by itself may be started again; a new start counts its frames from 0.
    """

    @property
    def name(self) -> str:
        """For people."""

    @property
    def rate_hz(self) -> int:
        """Frames a second."""

    @property
    def channels(self) -> int:
        """Samples in a frame."""

    @property
    def simulated(self) -> bool:
        """Whether the samples are computed, not measured."""

    def start(self, deliver: Deliver, ended: Ended) -> None:
        """Begin to deliver; may wait for the audio system.

        ``ended`` is called once, from any thread, where the source ends by itself; after ``stop``
        neither is called. Raises Refusal or InputError where it cannot start.
        """

    def stop(self) -> None:
        """Deliver nothing more; returns within 0.1 s, whatever the audio system does."""
