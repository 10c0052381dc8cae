"""Where sources leave their blocks, and callers their wishes, for the session's one thread."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from queue import Empty, SimpleQueue

from fieldkit.capture.clock import now_s
from fieldkit.capture.source import Block, SourceEnd

MOST_WAITING_S = 10.0


@dataclass(frozen=True, slots=True)
class Arrived:
    """A block, from which start of the source, and when."""

    run: int
    block: Block
    at_s: float


@dataclass(frozen=True, slots=True)
class Gone:
    """A start of the source came to its end."""

    run: int
    end: SourceEnd


@dataclass(frozen=True, slots=True)
class NotOpened:
    """A start of the source failed."""

    run: int
    reason: str


Wish = Callable[[], None]
Item = Arrived | Gone | NotOpened | Wish


class Inbox:
    """Nothing that is put waits, and no more than MOST_WAITING_S of frames are held."""

    def __init__(self, *, rate_hz: float) -> None:
        self._most = round(MOST_WAITING_S * rate_hz)
        self._arrived = self._taken = 0
        self._dropped = 0
        self._queue: SimpleQueue[Item] = SimpleQueue()

    def put(self, item: Gone | NotOpened | Wish) -> None:
        """Leave anything but a block."""
        self._queue.put(item)

    def deliver(self, run: int, block: Block) -> None:
        """Leave a block; only one thread at a time does."""
        count = len(block.samples)
        if self._arrived - self._taken + count > self._most:
            self._dropped += count + (block.lost_frames or 0)
            return
        if self._dropped:
            lost = self._dropped + (block.lost_frames or 0)
            block = replace(block, lost_frames=lost, cause="the computer was too slow")
            self._dropped = 0
        self._arrived += count
        self._queue.put(Arrived(run, block, now_s()))

    def take(self, within_s: float) -> Item | None:
        """The next item; None where there is none in time."""
        try:
            item = self._queue.get(timeout=within_s)
        except Empty:
            return None
        if isinstance(item, Arrived):
            self._taken += len(item.block.samples)
        return item
