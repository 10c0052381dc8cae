"""A running recording behind its screen: session, spectrum, order lines, one recording."""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

from fieldkit.capture.live import LivePicture, LiveSpectrum, order_frequencies
from fieldkit.capture.practice import PracticeSource
from fieldkit.capture.session import Session
from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.snapshot import RUNNING, Snapshot
from fieldkit.errors import FieldkitError
from fieldkit.job.recorded import next_recording
from fieldkit.ui.capture.channel_forms import machines
from fieldkit.ui.capture.takes import Take, remove_empty
from fieldkit.ui.capture.wiring import Wiring, ears_of, source_of

if TYPE_CHECKING:
    from fieldkit.capture.source import Source
    from fieldkit.job.document import Job
    from fieldkit.ui.capture.bench import Bench

_KEPT_S = 1.0
_CLOSED_WITHIN_S = 30.0
_HIGHEST_HZ, _OVER = 1000.0, 1.1
"""Order lines are drawn up to there, and the picture reaches a little over the highest."""
_LEAST_S = 1.0
"""A shorter recording tells nothing."""


@dataclass(frozen=True)
class RunningLook:
    """Everything the screen shows at one moment."""

    session: Snapshot
    picture: LivePicture | None
    channels: tuple[ChannelSetup, ...]
    shown: int
    """The channel whose spectrum is drawn, from 0."""
    orders: tuple[tuple[str, float], ...]
    """(name, frequency in Hz) of every order line."""
    wanted_s: float
    trouble: str = ""

    @property
    def done_s(self) -> float:
        """Recorded so far."""
        return self.session.recording.seconds if self.session.recording else 0.0

    @property
    def done(self) -> bool:
        """Whether it has its length."""
        return self.session.recording is not None and self.session.recording.done


class RunningRun:
    """Records as soon as the input delivers, until it has its length."""

    def __init__(
        self,
        source: Source,
        channels: tuple[ChannelSetup, ...],
        wiring: Wiring,
        job: Job,
        job_path: Path,
    ) -> None:
        self._source = source
        self._channels = channels
        self._wiring = wiring
        self._path = next_recording(job_path, "running")
        self._asked = False
        self._trouble = ""
        self._shown = ears_of(channels)[0].channel
        setup = channels[self._shown]
        self._orders = _order_lines(wiring, job)
        top_hz = max([job.goal.up_to_hz, *(_OVER * hz for _, hz in self._orders)])
        self.session = Session(source, keep_s=_KEPT_S)
        self._live = LiveSpectrum(
            rate_hz=source.rate_hz,
            channel=self._shown,
            top_hz=top_hz,
            quantity=setup.quantity,
            scale=setup.si_per_unit,
        )
        self.session.add(self._live)
        self.session.start()
        if isinstance(source, PracticeSource) and source.plant.machine is not None:
            source.machine(on=True, speed_rpm=self._speed_rpm(source.plant.machine.name))

    @classmethod
    def begin(cls, job: Job, job_path: Path, wiring: Wiring, bench: Bench) -> RunningRun:
        """Make the source and open it; may take seconds. Raises InputError or Refusal."""
        return cls(source_of(job, wiring, bench), wiring.channels(job), wiring, job, job_path)

    def look(self) -> RunningLook:
        """How things are; begins to record as soon as the input delivers."""
        shot = self.session.snapshot()
        if shot.state == RUNNING and not self._asked:
            self._record()
        return RunningLook(
            shot,
            self._live.picture,
            self._channels,
            self._shown,
            self._orders,
            self._wiring.seconds,
            self._trouble,
        )

    def stop(self) -> None:
        """End it; returns at once."""
        self.session.stop()

    def finish(self) -> tuple[Take, ...]:
        """Stop, and wait until all is on the disk; may take seconds."""
        self.session.stop()
        if not self.session.join(_CLOSED_WITHIN_S):
            self._trouble = "the disk or the input does not answer: look at the file before use"
        state = self.session.snapshot().recording
        if state is None:
            return ()
        long_enough = state.seconds >= _LEAST_S
        if not long_enough and self._source.simulated:
            remove_empty(self._path)
        take = Take(self._path, self._channels, "running", usable=int(long_enough))
        takes = [replace(take, path=path) for path in state.paths]
        return (replace(takes[0], note=self._note()), *takes[1:])

    @property
    def trouble(self) -> str:
        """What ended it early, or keeps it from the disk."""
        shot = self.session.snapshot()
        failure = shot.recording.failure if shot.recording else ""
        return self._trouble or failure or (shot.message if shot.failed else "")

    def _record(self) -> None:
        self._asked = True
        try:
            self.session.record(self._path, self._channels, seconds=self._wiring.seconds)
        except FieldkitError as error:
            self._trouble = str(error)

    def _note(self) -> str:
        """The speeds that were read, for the job file."""
        read = [f"{name} at {60 * hz:.0f} rpm" for name, hz in self._wiring.speeds_hz.items()]
        return ", ".join(read)

    def _speed_rpm(self, name: str) -> float | None:
        speed_hz = self._wiring.speeds_hz.get(name)
        return None if speed_hz is None else 60 * speed_hz


def _order_lines(wiring: Wiring, job: Job) -> tuple[tuple[str, float], ...]:
    """Every order of every machine whose speed was read."""
    found = []
    for name, orders in machines(job).items():
        speed_hz = wiring.speeds_hz.get(name)
        if speed_hz is not None:
            lines = order_frequencies(60 * speed_hz, orders, _HIGHEST_HZ)
            found += [(f"{name} {order:g}x", hz) for order, hz in lines]
    return tuple(found)
