"""A sensitivity on a reference shaker, behind its screen: listens, and reads what it heard."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from fieldkit.capture.calibration import NEEDED_S, Calibration, calibrate
from fieldkit.capture.practice import PracticeSource
from fieldkit.capture.session import Session
from fieldkit.errors import FieldkitError
from fieldkit.ui.capture.takes import Take
from fieldkit.ui.capture.wiring import Wiring, source_of

if TYPE_CHECKING:
    from fieldkit.capture.snapshot import Snapshot
    from fieldkit.job.document import Job
    from fieldkit.ui.capture.bench import Bench

_SETTLE_S = 0.5
_CLOSED_WITHIN_S = 5.0


@dataclass(frozen=True)
class Calibrated:
    """What came of it."""

    wiring: Wiring
    """With the new sensitivity."""
    found: Calibration
    full_scale: str | None
    source: str
    simulated: bool

    @property
    def comment(self) -> str:
        """Date and result, for the job file."""
        where = "simulated by the practice rig" if self.simulated else f"through {self.source}"
        return f"{self.found.comment(self.full_scale)}, {where}"


class CalibrationRun:
    """Listens to one channel with the sensor on the shaker."""

    def __init__(
        self, wiring: Wiring, channel: int, reference_rms: float, job: Job, bench: Bench
    ) -> None:
        """May take seconds; raises InputError or Refusal."""
        self.wiring = wiring
        self.setup = wiring.channels(job)[channel]
        self.channel = channel
        self.reference_rms = reference_rms
        self._source = source_of(job, wiring, bench)
        if isinstance(self._source, PracticeSource):
            self._source.shake(reference_rms)
        self.session = Session(self._source, keep_s=NEEDED_S + _SETTLE_S)
        self.session.start()

    def shot(self) -> Snapshot:
        """How the session is."""
        return self.session.snapshot()

    def heard_s(self) -> float:
        """Seconds without a gap, as far as they are needed."""
        return len(self.session.latest()[1]) / self._source.rate_hz

    def level(self) -> float:
        """RMS of the last second, full scale 1."""
        _, samples = self.session.latest(1.0)
        if not len(samples):
            return 0.0
        return float(samples[:, self.channel].std())

    def read(self) -> Calibration | str:
        """The sensitivity from the last seconds, or why there is none; takes a moment."""
        _, samples = self.session.latest(NEEDED_S)
        try:
            return calibrate(
                samples[:, self.channel], self._source.rate_hz, reference_rms=self.reference_rms
            )
        except FieldkitError as error:
            return str(error)

    def taken(self, found: Calibration) -> Calibrated:
        """With the result in the wiring."""
        setup = found.setup(self.setup)
        wiring = self.wiring.with_setup(self.channel, setup)
        shot = self.shot()
        return Calibrated(wiring, found, self.setup.full_scale, shot.source, shot.simulated)

    def stop(self) -> None:
        """End it; returns at once."""
        self.session.stop()

    def finish(self) -> tuple[Take, ...]:
        """End it, and wait."""
        self.session.stop()
        self.session.join(_CLOSED_WITHIN_S)
        return ()

    @property
    def trouble(self) -> str:
        """What ended it early."""
        return self.shot().message if self.shot().failed else ""
