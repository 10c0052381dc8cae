"""An input of this computer as a source of samples, watched for all the ways it can fail."""

from __future__ import annotations

import threading
from contextlib import suppress
from typing import Any

from fieldkit.capture.clock import FrameClock, now_s
from fieldkit.capture.devices import Input, find_input, inputs_now, said
from fieldkit.capture.library import hold, let_go, list_anew, portaudio
from fieldkit.capture.source import Block, Deliver, Ended, SourceEnd
from fieldkit.errors import InputError, Refusal

LATENCY_S = 0.25
"""Asked of the device: a busy interpreter keeps the callback waiting for up to 0.1 s."""
STALLED_AFTER_S = 2.0
CLOSED_WITHIN_S = 1.0
_TICK_S = 0.1

OVERFLOWED = "the input overflowed"
SILENTLY = "frames went missing without a word from the input"


class PortAudioSource:
    """One input, opened by its name, so that it is found again after it was away."""

    simulated = False

    def __init__(
        self,
        device: Input,
        *,
        rate_hz: int | None = None,
        channels: int = 1,
        latency_s: float | str = LATENCY_S,
        stalled_after_s: float = STALLED_AFTER_S,
    ) -> None:
        if not 1 <= channels <= device.channels:
            raise InputError(
                f"{device.name} has {device.channels} channel(s), and {channels} were asked for",
                "choose as many as it has, or another input",
            )
        self.device = device
        self.name = device.name
        self.rate_hz = rate_hz or device.default_rate_hz
        self.channels = channels
        self.latency_s = latency_s
        self.stalled_after_s = stalled_after_s
        self._opened: _Opened | None = None
        self._stops = 0

    def start(self, deliver: Deliver, ended: Ended) -> None:
        """Open the input; raises Refusal or InputError where it cannot be."""
        stops = self._stops
        opened = _Opened(self, deliver, ended)
        opened.open()
        self._opened = opened
        if self._stops != stops:
            opened.close()

    def stop(self) -> None:
        """Close the input, in the background."""
        self._stops += 1
        if self._opened is not None:
            self._opened.close()


class _Opened:
    """A stream from its opening to its end."""

    def __init__(self, source: PortAudioSource, deliver: Deliver, ended: Ended) -> None:
        self._source = source
        self._deliver = deliver
        self._ended = ended
        self._clock = FrameClock(source.rate_hz)
        self._frames = 0
        self._blocks = 0
        self._over = False
        self._failure = ""
        self._wake = threading.Event()
        self._closed = threading.Event()
        self._closing = threading.Lock()
        self._stream: Any = None

    def open(self) -> None:
        source = self._source
        with portaudio() as sd:
            try:
                list_anew(sd)
                self._stream = sd.InputStream(
                    device=self._index(sd),
                    samplerate=source.rate_hz,
                    channels=source.channels,
                    dtype="float32",
                    latency=source.latency_s,
                    callback=self._take,
                    finished_callback=self._wake.set,
                )
                hold(self)
                self._stream.start()
            except (sd.PortAudioError, ValueError) as error:
                self._give_up()
                raise Refusal(
                    f"{source.name} cannot be opened at {source.rate_hz} Hz with "
                    f"{source.channels} channel(s): {said(error)}",
                    "choose another rate or input, or close the program that holds it",
                ) from None
        threading.Thread(target=self._watch, name="input watch", daemon=True).start()

    def _index(self, sd: Any) -> int:
        wanted = self._source.device
        listed = inputs_now(sd)
        same = [i for i in listed if (i.name, i.host_api) == (wanted.name, wanted.host_api)]
        if not same:
            raise Refusal(f"{wanted.name} is not there", "plug it in again")
        return find_input(min(same, key=lambda i: abs(i.index - wanted.index)).index, same).index

    def _give_up(self) -> None:
        self._over = True
        if self._stream is not None:
            with suppress(Exception):
                self._stream.close()
        let_go(self)

    def _take(self, indata: Any, frames: int, _times: Any, status: Any) -> None:
        """The callback: copy, compare, hand over."""
        if self._over:
            return
        try:
            self._deliver(self._block(indata.copy(), frames, bool(status.input_overflow)))
        except Exception as error:
            self._failure = f"{type(error).__name__}: {error}"
            self._wake.set()

    def _block(self, samples: Any, frames: int, overflowed: bool) -> Block:
        at_s = now_s()
        first = self._frames
        self._frames += frames
        self._blocks += 1
        if overflowed and first:
            lost = round(self._clock.lag_s(at_s) * self._source.rate_hz) - frames
            self._clock.begin_anew()
            self._clock.feed(at_s, frames)
            return Block(first, samples, lost if lost > 0 else None, OVERFLOWED, exact=False)
        missing = self._clock.feed(at_s, frames)
        if missing is None:
            return Block(first, samples)
        lost, within = missing
        return Block(
            first, samples, lost, SILENTLY, exact=False, within_frames=min(within - frames, first)
        )

    def _watch(self) -> None:
        """Until the end: has the stream finished by itself, does anything arrive?"""
        seen, idle = 0, 0
        while not self._wake.wait(_TICK_S):
            seen, idle = self._blocks, 0 if self._blocks != seen else idle + 1
            if idle * _TICK_S >= self._source.stalled_after_s:
                break
        finished = self._wake.is_set()
        if not self.close():
            return
        answered = self._closed.wait(CLOSED_WITHIN_S)
        self._ended(self._reason(finished=finished, answered=answered))

    def _reason(self, *, finished: bool, answered: bool) -> SourceEnd:
        name = self._source.name
        if self._failure:
            return SourceEnd("failed", f"{name} could not be read ({self._failure})")
        if finished:
            return SourceEnd("vanished", f"{name} is gone")
        if answered:
            return SourceEnd("stalled", f"{name} delivers nothing")
        return SourceEnd("frozen", f"the audio server behind {name} does not answer")

    def close(self) -> bool:
        """Close the stream in a thread of its own: a frozen server keeps it for half a minute.

        False where it was closed before.
        """
        with self._closing:
            if self._over:
                return False
            self._over = True
        self._wake.set()
        threading.Thread(target=self._close, name="input closing", daemon=True).start()
        return True

    def _close(self) -> None:
        with suppress(Exception), portaudio(answer_within_s=120.0):
            self._stream.abort(ignore_errors=True)
            self._stream.close(ignore_errors=True)
        let_go(self)
        self._closed.set()
