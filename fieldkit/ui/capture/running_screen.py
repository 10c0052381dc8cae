"""A running recording under way: time left, overall level, spectrum with the order lines."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal
from textual.content import Content
from textual.widgets import Footer

from fieldkit.capture.snapshot import ENDED, OPENING, PAUSED, WAITING
from fieldkit.ui.capture.level_meter import meter_line
from fieldkit.ui.capture.live_screen import LEAVING_KEYS, Begin, LiveScreen
from fieldkit.ui.capture.running_run import RunningRun
from fieldkit.ui.capture.tap_words import BAD, CALM, GO, GOOD
from fieldkit.ui.units import AMPLITUDES, level
from fieldkit.ui.views.base import plain
from fieldkit.ui.widgets import BandShade, Curve, Mark, SpectrumPlot
from fieldkit.ui.words import seconds, sentence

if TYPE_CHECKING:
    from fieldkit.ui.capture.running_run import RunningLook

_WORDS = {
    OPENING: ("one moment", "Opening the input.", CALM),
    WAITING: ("input gone", "Plug it in again: it goes on by itself, the gap is marked.", BAD),
    PAUSED: ("paused", "", CALM),
}
_LEAST_S = 1.0


class RunningScreen(LiveScreen[RunningRun]):
    """Records for its length, then keeps it by itself."""

    TITLE = "Running recording"
    KEEP = "Keep it so far"
    GO_ON = "Go on"
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("s,enter", "keep", "Stop and keep", key_display="s", id="recording.keep",
                tooltip="Stop now, and add what was recorded to the job"),
        *LEAVING_KEYS,
    ]  # fmt: skip

    def __init__(
        self, begin: Begin[RunningRun], job_title: str, bands: Sequence[BandShade] = ()
    ) -> None:
        super().__init__(begin)
        self.job_title = job_title
        self.bands = tuple(bands)
        self._picture = 0

    def compose(self) -> ComposeResult:
        """Words, level, spectrum."""
        yield plain("live-title", classes="live-title")
        with Horizontal(id="banner"):
            yield plain("big")
            yield plain("side")
        yield plain("now", classes="live-now")
        yield plain("meters")
        yield SpectrumPlot(id="live-spectrum", empty="Listening ...")
        yield Footer(compact=True, show_command_palette=False)

    def on_mount(self) -> None:
        """The plot takes the keys that the screen does not; the base's handler runs as well."""
        self.query_one("#live-spectrum").focus()

    def poll(self) -> None:
        """Everything from one look."""
        if self.adding is not None:
            self.say_big("saving", CALM)
            return
        title = f"{self.TITLE}  {self.job_title}"
        if self.run is None:
            self.say("#live-title", self.title_line(title, False))
            self.say_big("not now" if self.refused else "one moment",
                         BAD if self.refused else CALM)  # fmt: skip
            self.say("#now", self.refused or "Getting the input ready.")
            return
        look = self.run.look()
        self.say("#live-title", self.title_line(title, look.session.simulated))
        large, below, tone = headline(look)
        self.say_big(large, tone)
        self.say("#now", below)
        self.say("#side", "\n".join(side_lines(look)))
        self._say_levels(look)
        self._draw(look)
        if look.done and not look.session.failed and not look.session.recording.failure:  # type: ignore[union-attr]
            self.end(add=True)

    def _say_levels(self, look: RunningLook) -> None:
        lines = [
            meter_line(one, f"{i + 1} {look.channels[i].direction or look.channels[i].quantity}",
                       self.size.width - 2)
            for i, one in enumerate(look.session.levels)
        ]  # fmt: skip
        self.say("#meters", Content("\n").join(lines))

    def _draw(self, look: RunningLook) -> None:
        picture = look.picture
        if picture is None or picture.number == self._picture:
            return
        self._picture = picture.number
        factor, unit = AMPLITUDES.get(picture.unit, (1.0, picture.unit))
        self.query_one("#live-spectrum", SpectrumPlot).show(
            (
                Curve(picture.frequency_hz, factor * picture.averaged, "average"),
                Curve(picture.frequency_hz, factor * picture.now, "now", "second"),
            ),
            tuple(Mark(hz, name, "tone") for name, hz in look.orders),
            self.bands,
            amplitude_unit=f"{unit} rms",
            up_to_hz=float(picture.frequency_hz[-1]),
        )

    def action_keep(self) -> None:
        """Stop before its length."""
        if self._seconds < _LEAST_S:
            self.notify("Nothing to keep yet; esc leaves.", markup=False)
            return
        self.end(add=True)

    def unsaved(self) -> str:
        """What leaving would keep from the job."""
        return seconds(self._seconds) if self._seconds >= _LEAST_S else ""

    @property
    def _seconds(self) -> float:
        return self.run.look().done_s if self.run else 0.0


def headline(look: RunningLook) -> tuple[str, str, str]:
    """(large words, one line below, tone)."""
    session = look.session
    wrong = look.trouble or (session.recording.failure if session.recording else "")
    if wrong:
        return "stopped", sentence(wrong), BAD
    if session.state == ENDED:
        return "stopped", sentence(session.message) or "The input ended.", BAD
    if session.state in _WORDS:
        large, below, tone = _WORDS[session.state]
        return large, sentence(session.message) or below, tone
    if look.done:
        return "done", "It has its length.", GOOD
    return "recording", sentence(session.message) or "Keep the speed steady; touch nothing.", GO


def side_lines(look: RunningLook) -> list[str]:
    """Time left, and the overall level."""
    left_s = max(look.wanted_s - look.done_s, 0.0)
    picture = look.picture
    overall = "" if picture is None else f"overall {level(picture.overall, picture.unit)} rms"
    orders = "" if look.orders else "speed not noted: no order lines"
    return [f"{seconds(left_s)} left of {seconds(look.wanted_s)}", overall, orders]
