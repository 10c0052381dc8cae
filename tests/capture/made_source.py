"""A source whose samples are made up, delivered as fast as they are taken."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable

import numpy as np

from fieldkit.capture.source import Block, SourceEnd

RATE_HZ = 8000


class MadeSource:
    """Delivers the blocks that ``steps`` yields; what else it yields is done in between.

    A step is a Block, a SourceEnd (the source ends; started again, it goes on with the next step),
    or a function to call, such as one that waits.
    """

    simulated = True

    def __init__(self, steps, *, channels=1, rate_hz=RATE_HZ, name="made up"):
        self.name = name
        self.rate_hz = rate_hz
        self.channels = channels
        self.starts = 0
        self._steps = iter(steps)
        self._stopped = threading.Event()

    def start(self, deliver, ended):
        self.starts += 1
        threading.Thread(target=self._run, args=(deliver, ended), daemon=True).start()

    def stop(self):
        self._stopped.set()

    def _run(self, deliver, ended):
        for step in self._steps:
            if self._stopped.is_set():
                return
            if isinstance(step, SourceEnd):
                ended(step)
                return
            if isinstance(step, Block):
                deliver(step)
            else:
                step()
        ended(SourceEnd("finished", "all was delivered"))


def block(samples, first_frame=0, **more) -> Block:
    """A block of a list of samples, or of so many counted up."""
    if isinstance(samples, int):
        samples = (first_frame + np.arange(samples)) % 1000 / 1000
    array = np.asarray(samples, np.float32)
    return Block(first_frame, array.reshape(len(array), -1), **more)


def waits_for(condition: Callable[[], bool]) -> Callable[[], None]:
    """A step that waits."""

    def wait() -> None:
        end = time.monotonic() + 60.0
        while not condition():
            assert time.monotonic() < end, "waited in vain"
            time.sleep(0.001)

    return wait
