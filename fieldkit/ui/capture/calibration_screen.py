"""Calibration on a reference shaker: level and steadiness live, the result to be taken."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, ClassVar

from textual import work
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical
from textual.message import Message
from textual.screen import ModalScreen
from textual.widgets import Static

from fieldkit.capture.calibration import NEEDED_S, REFERENCE, REFERENCE_HZ, Calibration
from fieldkit.capture.meter import decibels
from fieldkit.capture.snapshot import RUNNING
from fieldkit.errors import FieldkitError
from fieldkit.quantity import parse
from fieldkit.ui.capture.bench import Bench, in_background
from fieldkit.ui.capture.calibration_run import Calibrated, CalibrationRun
from fieldkit.ui.capture.channel_forms import REFERENCE as REFERENCE_FORM
from fieldkit.ui.capture.level_meter import meter_line
from fieldkit.ui.capture.live_screen import POLL_S
from fieldkit.ui.capture.wiring import Wiring
from fieldkit.ui.forms import FormWindow, Values
from fieldkit.ui.views.base import plain
from fieldkit.ui.words import SIMULATED, safe, sentence

if TYPE_CHECKING:
    from fieldkit.job.document import Job

HOW = (
    f"Screw the sensor onto the reference shaker ({REFERENCE_HZ:.2f} Hz), switch it on, let go of "
    "the cable and wait. The level of the shaker: r changes it."
)


@dataclass
class Opened(Message):
    """The input is being listened to, or not."""

    refused: str = ""


@dataclass
class Judged(Message):
    """A reading, or why there is none."""

    found: Calibration | str


class CalibrationScreen(ModalScreen[Calibrated | None]):
    """Gives what was measured, or None."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("enter,s", "take", "Take it", id="calibration.take"),
        Binding("r", "reference", "Level of the shaker", id="calibration.reference"),
        Binding("escape", "dismiss", "Leave", id="calibration.leave"),
    ]

    def __init__(self, wiring: Wiring, channel: int, job: Job, bench: Bench) -> None:
        super().__init__()
        self.wiring = wiring
        self.channel = channel
        self.job = job
        self.bench = bench
        self.reference = REFERENCE
        self.run: CalibrationRun | None = None
        self.refused = ""
        self.found: Calibration | str = ""
        self._reading = self._gone = False
        self._turn = 0

    def compose(self) -> ComposeResult:
        """How, the level, the result, keys."""
        with Vertical(classes="window calibration-window"):
            yield plain("calibration-title", classes="window-title")
            yield Static(HOW, markup=False)
            yield plain("calibration-reference")
            with Horizontal(classes="calibration-level"):
                yield plain("calibration-meter")
            yield plain("calibration-result")
            yield Static("enter takes the result · r level of the shaker · esc leaves",
                         markup=False, classes="hint")  # fmt: skip

    def on_mount(self) -> None:
        """Listen."""
        self._say("title", f"Calibrate channel {self.channel + 1}")
        self.set_interval(POLL_S, self.poll)
        self._listen()

    def on_unmount(self) -> None:
        """Nothing listens on."""
        self._gone = True
        if self.run is not None:
            self.run.stop()

    def _listen(self) -> None:
        if self.run is not None:
            self.run.stop()
        self.run, self.found, self._reading = None, "", False
        self._turn += 1
        self._say("reference", f"Reference: {self.reference} rms")
        self._say("result", "Getting the input ready ...")
        in_background(self, lambda turn=self._turn: self._opened(turn))  # type: ignore[misc]

    def _opened(self, turn: int) -> Message:
        try:
            level = parse(self.reference, "acceleration")
            run = CalibrationRun(self.wiring, self.channel, level, self.job, self.bench)
        except FieldkitError as error:
            return Opened(str(error))
        if self._gone or turn != self._turn:
            run.stop()
            return Opened()
        self.run = run
        if self._gone:
            run.stop()
        return Opened()

    def on_opened(self, message: Opened) -> None:
        """Where it cannot be listened to."""
        self.refused = message.refused
        if self.refused:
            self._say("result", f"✗ {sentence(self.refused)}")

    def poll(self) -> None:
        """Level at once, a reading as soon as enough is heard."""
        run = self.run
        if run is None:
            return
        shot = run.shot()
        if shot.simulated:
            self._say("title", f"{SIMULATED}  Calibrate channel {self.channel + 1}")
        if self.channel < len(shot.levels):
            width = max(self.query_one("#calibration-meter").size.width, 50)
            meter = meter_line(shot.levels[self.channel], f"channel {self.channel + 1}", width)
            self.query_one("#calibration-meter", Static).update(meter)
        if shot.state != RUNNING:
            self._say("result", sentence(shot.message) or "Opening the input ...")
        elif run.heard_s() < NEEDED_S:
            self._say("result", f"Hold still: {run.heard_s():.1f} of {NEEDED_S:g} s heard.")
        elif not self._reading:
            self._reading = True
            in_background(self, lambda: Judged(run.read()))

    def on_judged(self, message: Judged) -> None:
        """Show it; the next reading follows."""
        self._reading = False
        self.found = message.found
        self._say("result", "\n".join(self._result()))

    def _result(self) -> list[str]:
        found = self.found
        if isinstance(found, str):
            return [f"✗ No result: {sentence(found)}"]
        setup = self.run.setup if self.run else None
        keys = found.keys(setup.full_scale if setup else None)
        value = keys.get("sensitivity") or keys["scale"]
        return [
            f"✓ {value}, ±{200 * found.relative_sd:.1f} % (two standard deviations)",
            f"  {found.frequency_hz:.2f} Hz, level {decibels(found.sample_rms):.1f} dB of full "
            f"scale, steady to {100 * found.level_sd:.2f} %, harmonics "
            f"{100 * found.distortion:.2f} %",
        ]

    def action_take(self) -> None:
        """The result goes into the set-up."""
        if self.run is None or isinstance(self.found, str):
            self.notify("There is no result to take yet.", markup=False)
            return
        self.dismiss(self.run.taken(self.found))

    @work
    async def action_reference(self) -> None:
        """Another shaker: 1 g, or what its sheet says."""

        def objection(values: Values) -> str:
            if parse(values["level"], "acceleration") <= 0:
                return "the level of the shaker is above zero: write 10 m/s^2 or 1 g"
            return ""

        start = {"level": self.reference}
        window = FormWindow(REFERENCE_FORM, "Reference shaker", start, self.job.units, objection)
        values = await self.app.push_screen_wait(window)
        if values:
            self.reference = values["level"]
            self._listen()

    def _say(self, part: str, text: str) -> None:
        self.query_one(f"#calibration-{part}", Static).update(safe(text))
