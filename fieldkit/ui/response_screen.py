"""The frequency response over the Tap view: magnitude with the fitted modes, coherence below."""

from __future__ import annotations

from typing import TYPE_CHECKING, ClassVar

import numpy as np
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical, VerticalScroll
from textual.screen import ModalScreen
from textual.widgets import Static

from fieldkit.sheet.responses import headline, shown_mass
from fieldkit.ui.dialogs import TextScreen
from fieldkit.ui.widgets import Curve, Mark, SpectrumPlot
from fieldkit.ui.words import safe, sentence

if TYPE_CHECKING:
    from fieldkit.ui.desk import Desk
    from fieldkit.workup import ResponseReading, TapReading

TITLE = "Frequency response"
NO_HAMMER = """\
This recording has no hammer channel.

A frequency response needs the force of each blow, recorded beside the sensor on a channel of its
own. Where there is one, press e on the recording and type its number at "hammer channel".

With the sensitivity of both channels the response is in (m/s^2)/N; with the station of the sensor
and that of the hammer, the same one for both, each mode tells its effective mass.

Frequencies and damping need none of this: they come from the taps as they are.
"""
NOT_READ = "Nothing has been read yet: a response comes once a recording has been worked out."
ONE_BLOW = "One blow only: coherence needs two or more"
COHERENCE = "coherence"
"""As wide as the widest unit of the magnitude, so that the axes of both plots line up."""
_LIMIT = "force 20 dB down"


class ResponseScreen(ModalScreen[None]):
    """Two plots that pan and zoom together, and what to know about them."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape,enter,q,h", "dismiss", "Close", priority=True, id="response.close"),
        Binding("tab", "app.focus_next", "Next", show=False, id="response.next"),
    ]

    def __init__(
        self, found: ResponseReading, notes: tuple[str, ...], up_to_hz: float, units: str
    ) -> None:
        super().__init__()
        self.found = found
        self.notes = notes
        self.up_to_hz = up_to_hz
        self.units = units

    def compose(self) -> ComposeResult:
        """Title, magnitude, coherence, words, keys."""
        with Vertical(classes="window response-window"):
            yield Static(safe(headline(self.found)), markup=False, classes="window-title")
            yield SpectrumPlot(id="response-magnitude")
            yield SpectrumPlot(empty=ONE_BLOW, id="response-coherence")
            with VerticalScroll(classes="response-words", can_focus=True):
                yield Static(safe("\n".join(self._words())), markup=False, id="response-words")
            yield Static(
                "esc closes · ←→ pan · +− zoom · ,. cursor · [] modes · tab next",
                markup=False,
                classes="hint",
            )

    def on_mount(self) -> None:
        """Fill the plots; the first one has the keyboard."""
        magnitude, coherence = self._plots
        coherence.amplitude_log = False
        magnitude.show(
            magnitude_curves(self.found),
            marks_of(self.found),
            amplitude_unit=self._unit.ljust(len(COHERENCE)),
            up_to_hz=self.up_to_hz,
        )
        coherence.show(
            coherence_curves(self.found), amplitude_unit=COHERENCE, up_to_hz=self.up_to_hz
        )
        magnitude.focus()

    @property
    def _plots(self) -> tuple[SpectrumPlot, SpectrumPlot]:
        return (
            self.query_one("#response-magnitude", SpectrumPlot),
            self.query_one("#response-coherence", SpectrumPlot),
        )

    @property
    def _unit(self) -> str:
        response = self.found.response
        return response.unit if response is not None and response.calibrated else ""

    def on_spectrum_plot_range_changed(self, event: SpectrumPlot.RangeChanged) -> None:
        """The other plot shows the same frequencies."""
        for plot in self._plots:
            if plot is not event.plot and not plot.data.empty:
                plot.axis = event.plot.axis

    def on_spectrum_plot_cursor_moved(self, event: SpectrumPlot.CursorMoved) -> None:
        """And the same cursor."""
        for plot in self._plots:
            if plot is not event.plot and not plot.data.empty:
                plot.cursor = event.frequency_hz

    def _words(self) -> list[str]:
        """Coherence and effective mass of each mode, then what to know."""
        return [*mode_lines(self.found, self.units), *(sentence(note) for note in self.notes)]


def mode_lines(found: ResponseReading, units: str) -> list[str]:
    """One line for each mode."""
    fitted = found.fitted
    out = []
    for mode, mass in zip(fitted.modes if fitted else (), found.masses, strict=True):
        parts = [f"{mode.frequency_hz:8.2f} Hz"]
        if mode.coherence is not None:
            parts.append(f"coherence {mode.coherence:.3f}")
        if mass is not None:
            parts.append("effective mass {} ± {}".format(*shown_mass(mass, units)))
        out.append("  ".join(parts))
    return out


def magnitude_curves(found: ResponseReading) -> tuple[Curve, ...]:
    """H1 as measured, and the modes fitted to it as far as the force excites."""
    response = found.response
    if response is None:
        return ()
    at = response.frequency_hz
    measured = Curve(at, np.abs(response.h1), "measured")
    if found.fitted is None:
        return (measured,)
    inside = at <= (found.usable_to_hz or at[-1])
    fitted = Curve(at[inside], np.abs(found.fitted.at(at[inside])), "fitted", "model")
    return measured, fitted


def coherence_curves(found: ResponseReading) -> tuple[Curve, ...]:
    """Coherence; nothing for one blow."""
    response = found.response
    if response is None or response.coherence is None:
        return ()
    return (Curve(response.frequency_hz, response.coherence),)


def marks_of(found: ResponseReading) -> tuple[Mark, ...]:
    """The modes, and where the force ends."""
    modes = tuple(Mark(mode.frequency_hz) for mode in (found.fitted.modes if found.fitted else ()))
    limit_hz = found.usable_to_hz
    return (*modes, Mark(limit_hz, _LIMIT, "refused")) if limit_hz else modes


def response_window(desk: Desk, reading: TapReading | None) -> ModalScreen[None]:
    """The response of a recording, or a text that says what is missing."""
    from fieldkit import workup

    if reading is None or desk.workup is None:
        return TextScreen(TITLE, NOT_READ)
    found = workup.response_reading(reading, desk.workup.evidence, desk.up_to_hz)
    if found is None:
        return TextScreen(TITLE, NO_HAMMER)
    notes = workup.response_notes(found, desk.up_to_hz)
    if found.response is None:
        return TextScreen(TITLE, "\n".join(sentence(note) for note in notes))
    return ResponseScreen(found, notes, desk.up_to_hz, desk.job.units if desk.job else "SI")
