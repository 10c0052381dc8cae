"""A capture session: one source, one thread, a recording, and whoever listens.

Every method returns at once, so that a screen may call it; ``snapshot`` says how things are.
"""

from __future__ import annotations

import threading
from collections.abc import Sequence
from contextlib import suppress
from dataclasses import replace
from datetime import datetime
from pathlib import Path
from typing import Protocol

from fieldkit.capture.clock import now_s
from fieldkit.capture.inbox import Arrived, Gone, Inbox, NotOpened
from fieldkit.capture.meter import Meter
from fieldkit.capture.ring import Ring
from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.sidecar import RecordingInfo
from fieldkit.capture.snapshot import (
    ENDED,
    OPENING,
    PAUSED,
    RUNNING,
    WAITING,
    RecordingState,
    Snapshot,
)
from fieldkit.capture.source import Block, Samples, Source, SourceEnd
from fieldkit.capture.writer import RecordingWriter
from fieldkit.errors import FieldkitError, InputError, Refusal

KEEP_S = 10.0
RETRY_EVERY_S = 1.0
_TICK_S = 0.1
_PAUSED = "paused"


class Listener(Protocol):
    """Gets every block of a session, in its thread; must be quick."""

    def feed(self, block: Block) -> None:
        """Take a block; ``first_frame`` counts from the session's start."""


class Session:
    """From ``start`` to ``stop``; goes on by itself when a source that was away is back."""

    def __init__(
        self,
        source: Source,
        *,
        keep_s: float = KEEP_S,
        retry_every_s: float = RETRY_EVERY_S,
        give_up_after_s: float | None = None,
    ) -> None:
        """``keep_s`` of the past can be had by ``latest``; ``give_up_after_s`` without the source
        the session ends, or never."""
        self._source = source
        self._retry_every_s = retry_every_s
        self._give_up_after_s = give_up_after_s
        self._inbox = Inbox(rate_hz=source.rate_hz)
        self._ring = Ring(frames=round(keep_s * source.rate_hz), channels=source.channels)
        self._meter = Meter(rate_hz=source.rate_hz, channels=source.channels)
        self._listeners: tuple[Listener, ...] = (self._ring,)
        self._recording: _Recording | None = None
        self._earlier: list[_Recording] = []
        self._run = 0
        self._frames = self._lost = self._gaps = 0
        self._paused = False
        self._skipped, self._skipped_exact = 0, True
        self._away: SourceEnd | None = None
        self._away_since_s = self._tried_s = self._last_block_s = 0.0
        self._trying = False
        self._state = OPENING
        self._message = ""
        self._failed = False
        self._snapshot = self._published()
        self._thread = threading.Thread(target=self._work, name="capture", daemon=True)

    def start(self) -> None:
        """Open the source in the background and begin to listen; once."""
        self._thread.start()

    def stop(self) -> None:
        """End recording and session; ``join`` waits for it."""
        self._inbox.put(lambda: self._end("stopped by the user", failed=False))

    def join(self, within_s: float | None = None) -> bool:
        """Wait until all is written and closed; False where that took longer."""
        self._thread.join(within_s)
        return not self._thread.is_alive()

    def snapshot(self) -> Snapshot:
        """How things are."""
        return self._snapshot

    def latest(self, seconds: float | None = None) -> tuple[int, Samples]:
        """Number of the first frame, and a copy of the last seconds without a gap in them."""
        return self._ring.latest(None if seconds is None else round(seconds * self._source.rate_hz))

    def pause(self) -> None:
        """Let recording and listeners miss what comes; the meter goes on."""
        self._inbox.put(lambda: self._set_paused(True))

    def resume(self) -> None:
        """Go on, with the gap marked."""
        self._inbox.put(lambda: self._set_paused(False))

    def reset_meter(self) -> None:
        """Turn the clip lamps off."""
        self._inbox.put(self._meter.reset)

    def add(self, listener: Listener) -> None:
        """Let it hear every block from now on."""
        self._inbox.put(lambda: self._set_listeners((*self._listeners, listener)))

    def remove(self, listener: Listener) -> None:
        """Let it hear no more."""
        self._inbox.put(
            lambda: self._set_listeners(tuple(x for x in self._listeners if x is not listener))
        )

    def record(
        self,
        path: Path,
        channels: Sequence[ChannelSetup],
        *,
        seconds: float | None = None,
        before_s: float = 0.0,
    ) -> None:
        """Record from now on, or from what was kept of the last ``before_s``.

        ``seconds`` is its length; without it, it lasts until ``end_recording``. Creates the files
        at once and raises InputError where they cannot be, or the channels are not the source's;
        Refusal where the session has ended.
        """
        if self._snapshot.state == ENDED:
            raise Refusal(f"{self._source.name} is closed", "open it again")
        if len(channels) != self._source.channels:
            raise InputError(
                f"{len(channels)} channel(s) are described, and {self._source.name} delivers "
                f"{self._source.channels}",
                "describe each channel",
            )
        frames = None if seconds is None else max(1, round(seconds * self._source.rate_hz))
        writer = RecordingWriter(path, self._info(channels), most_frames=frames)
        self._inbox.put(lambda: self._begin(writer, before_s))

    def end_recording(self) -> None:
        """End the recording; the session goes on."""
        self._inbox.put(lambda: self._close_recording("stopped by the user"))

    def set_aside(self, frame: int, aside: bool = True) -> None:
        """Mark the blow at a frame of the session in the recording that holds it, or take the mark
        away; without a recording of it nothing is done."""
        self._inbox.put(lambda: self._mark_aside(frame, aside))

    def _info(self, channels: Sequence[ChannelSetup]) -> RecordingInfo:
        source = self._source
        return RecordingInfo(
            device=source.name,
            rate_hz=source.rate_hz,
            channels=tuple(channels),
            started=datetime.now().astimezone().isoformat(timespec="seconds"),
            simulated=source.simulated,
        )

    def _work(self) -> None:
        self._open()
        while self._state != ENDED:
            try:
                self._step()
            except Exception as error:
                self._end(f"capture failed ({type(error).__name__}: {error})", failed=True)
            self._snapshot = self._published()
        while (left := self._inbox.take(0.0)) is not None:
            if callable(left):
                left()

    def _step(self) -> None:
        item = self._inbox.take(_TICK_S)
        if isinstance(item, Arrived):
            self._arrived(item)
        elif isinstance(item, Gone):
            self._gone(item)
        elif isinstance(item, NotOpened):
            self._not_opened(item)
        elif item is not None:
            item()
        self._look_after()

    def _open(self) -> None:
        self._run += 1
        self._trying = True
        threading.Thread(
            target=self._try_to_open, args=(self._run,), name="input opening", daemon=True
        ).start()

    def _try_to_open(self, run: int) -> None:
        inbox = self._inbox
        try:
            self._source.start(
                lambda block: inbox.deliver(run, block), lambda end: inbox.put(Gone(run, end))
            )
        except FieldkitError as error:
            inbox.put(NotOpened(run, str(error)))
        except Exception as error:
            inbox.put(NotOpened(run, f"the input failed ({type(error).__name__}: {error})"))

    def _arrived(self, item: Arrived) -> None:
        if item.run != self._run:
            return
        block = item.block
        if self._away is not None:
            block = self._after_absence(block, item.at_s)
        elif block.lost_frames != 0 and self._frames:
            self._message = f"{block.cause}: the gap is marked"
        if self._state in (OPENING, WAITING):
            self._state = PAUSED if self._paused else RUNNING
        self._last_block_s = item.at_s
        self._meter.feed(block)
        if self._paused:
            self._skipped += len(block.samples) + (block.lost_frames or 0)
            self._skipped_exact &= block.lost_frames is not None and block.exact
            return
        if self._skipped:
            lost = self._skipped + (block.lost_frames or 0)
            exact = self._skipped_exact and block.exact
            block = replace(block, lost_frames=lost, cause=_PAUSED, exact=exact)
            self._skipped, self._skipped_exact = 0, True
        self._hand_on(replace(block, first_frame=self._frames))

    def _after_absence(self, block: Block, at_s: float) -> Block:
        """The first block after the source was away, with an estimate of what was missed."""
        away, self._away = self._away, None
        cause = away.message if away is not None else ""
        self._message = f"{self._source.name} is back, and the gap is marked"
        lost = round((at_s - self._last_block_s) * self._source.rate_hz) - len(block.samples)
        return replace(block, lost_frames=max(lost, 1), cause=cause, exact=False)

    def _hand_on(self, block: Block) -> None:
        if block.lost_frames != 0 and self._frames:
            self._gaps += 1
            self._lost += block.lost_frames or 0
        self._frames += len(block.samples)
        if self._recording is not None and not self._recording.done:
            self._recording.writer.feed(block)
        for listener in self._listeners:
            try:
                listener.feed(block)
            except Exception as error:
                self._set_listeners(tuple(x for x in self._listeners if x is not listener))
                self._message = (
                    f"a display failed and was taken off ({type(error).__name__}: {error}); "
                    "recording goes on"
                )

    def _gone(self, item: Gone) -> None:
        if item.run != self._run:
            return
        if item.end.kind == "finished":
            self._end(item.end.message, failed=False)
            return
        if self._away is None:
            self._away, self._away_since_s = item.end, now_s()
        self._not_now()
        self._state = WAITING
        recording = self._recording is not None and not self._recording.done
        safe = "what was recorded is safe, and " if recording else ""
        self._message = f"{item.end.message}: {safe}it goes on when the input is back"

    def _not_opened(self, item: NotOpened) -> None:
        if item.run != self._run:
            return
        self._not_now()
        if self._away is None:
            self._end(item.reason, failed=True)

    def _not_now(self) -> None:
        self._trying = False
        self._tried_s = now_s()

    def _look_after(self) -> None:
        """What no block brings about: a recording that is done, a source that is away."""
        if self._recording is not None and self._recording.writer.finished:
            self._close_recording("it has its length")
        if self._state != WAITING:
            return
        waited_s = now_s() - self._away_since_s
        if self._give_up_after_s is not None and waited_s > self._give_up_after_s:
            why = f"{self._source.name} did not come back within {self._give_up_after_s:.0f} s"
            self._end(why, failed=True)
        elif now_s() - self._tried_s > self._retry_every_s and not self._trying:
            self._open()

    def _begin(self, writer: RecordingWriter, before_s: float) -> None:
        if self._state == ENDED:
            writer.close("the input was closed")
            return
        self._close_recording("another recording began")
        if self._recording is not None:
            self._earlier.append(self._recording)
        first, samples = self.latest(before_s)
        self._recording = _Recording(writer, first)
        if len(samples):
            writer.feed(Block(first, samples))

    def _close_recording(self, why: str) -> None:
        if self._recording is None or self._recording.done:
            return
        self._recording.writer.close(why)
        self._recording.done = True
        if self._recording.writer.failure:
            self._message = self._recording.writer.failure

    def _mark_aside(self, frame: int, aside: bool) -> None:
        held = [r for r in (*self._earlier, self._recording) if r is not None]
        holding = [r for r in held if r.first_frame <= frame]
        if holding:
            holding[-1].writer.set_aside(frame, aside)
            self._message = holding[-1].writer.trouble or self._message

    def _set_paused(self, paused: bool) -> None:
        self._paused = paused
        if self._state in (RUNNING, PAUSED):
            self._state = PAUSED if paused else RUNNING

    def _set_listeners(self, listeners: tuple[Listener, ...]) -> None:
        self._listeners = listeners

    def _end(self, why: str, *, failed: bool) -> None:
        with suppress(Exception):
            self._source.stop()
        self._state, self._failed = ENDED, failed
        self._message = why if failed else self._message
        self._close_recording(why)

    def _published(self) -> Snapshot:
        return Snapshot(
            state=self._state,
            source=self._source.name,
            simulated=self._source.simulated,
            rate_hz=self._source.rate_hz,
            frames=self._frames,
            lost_frames=self._lost,
            gaps=self._gaps,
            levels=self._meter.levels,
            message=self._message,
            recording=None if self._recording is None else self._recording.state(),
            failed=self._failed,
        )


class _Recording:
    """A recording and where in the session it began."""

    def __init__(self, writer: RecordingWriter, first_frame: int) -> None:
        self.writer = writer
        self.first_frame = first_frame
        self.done = False

    def state(self) -> RecordingState:
        writer = self.writer
        return RecordingState(
            paths=writer.paths,
            seconds=writer.frames_written / writer.info.rate_hz,
            gaps=writer.gaps,
            first_frame=self.first_frame,
            done=self.done,
            failure=writer.failure,
        )
