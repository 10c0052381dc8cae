"""The practice rig on the command line: it strikes itself, or lets its machine run."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from fieldkit.capture.practice import PracticeSource
from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.source import Block
from fieldkit.cli.samples import sample_jobs
from fieldkit.job.document import Job
from fieldkit.job.schema import load_job
from fieldkit.workup.practice import practice_channels, practice_source

FIRST_S, EVERY_S = 3.0, 6.0


class Played:
    """A listener that strikes the rig every few seconds, or switches its machine on."""

    def __init__(self, source: PracticeSource, kind: str) -> None:
        self._source = source
        self._running = kind == "running"
        self._next = 0 if self._running else round(FIRST_S * source.rate_hz)

    def feed(self, block: Block) -> None:
        """Take a block of the session."""
        if block.first_frame + len(block.samples) < self._next:
            return
        if self._running:
            if self._source.plant.machine is not None:
                self._source.machine(on=True)
            self._next = 1 << 62
        else:
            self._source.tap()
            self._next += round(EVERY_S * self._source.rate_hz)


def rig(
    job: Path | None, channels: Sequence[ChannelSetup], kind: str, rate_hz: int | None
) -> PracticeSource:
    """The span of a job to practise on; of a sample where there is none."""
    return practice_source(_job(job), channels, running=kind == "running", rate_hz=rate_hz)


def rig_channels(job: Path | None, channels: Sequence[ChannelSetup]) -> tuple[ChannelSetup, ...]:
    """The channels with what nobody said filled in."""
    return practice_channels(_job(job), channels)


def _job(path: Path | None) -> Job:
    return load_job(path if path is not None else sample_jobs()[0])
