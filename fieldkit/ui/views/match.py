"""Match: measured against computed modes, and what the tap told about the unknowns."""

from __future__ import annotations

from typing import TYPE_CHECKING

from textual.app import ComposeResult
from textual.containers import Horizontal, VerticalScroll

from fieldkit.ui.table import Row, Table
from fieldkit.ui.units import interval
from fieldkit.ui.views.base import View, plain
from fieldkit.ui.widgets.interval_bar import interval_bar
from fieldkit.ui.words import DASH, hertz, plus_minus, sentence, span_of

if TYPE_CHECKING:
    from fieldkit.detune.matched import Match, Pair, ParameterReading


BAR = "├before ▓after┤"


class MatchView(View):
    """Pairs above, unknowns below, words beside."""

    NAME = "match"
    HOME = "#pairs"

    def compose(self) -> ComposeResult:
        """Two tables and a text."""
        yield Table(
            "mode",
            "measured Hz",
            "model 90 %",
            "before",
            "handbook",
            "apart",
            "direction",
            id="pairs",
        )
        with Horizontal(classes="lower"):
            yield Table("unknown", "told", BAR, "after 90 %", "before 90 %", id="parameters")
            with VerticalScroll(id="match-words", can_focus=True):
                yield plain("match-text")

    def draw(self) -> None:
        """Fill both tables and the words."""
        found = self.desk.workup.match if self.desk.workup else None
        self.table("#pairs").fill(_pair_rows(found) if found else [])
        self.table("#parameters").fill(_parameter_rows(found, self.desk.units) if found else [])
        self.write("#match-text", "\n\n".join(self._words(found)))

    def _words(self, found: Match | None) -> list[str]:
        if found is None:
            return [sentence(text) for text in self.desk.refusals("match")] or [
                "No match yet: it needs a tap recording, or a measured peak typed in (Tap, a)."
            ]
        words = [f"Next: {sentence(found.next_measurement)}"] if found.next_measurement else []
        words += self._contradictions()
        words += [sentence(warning) for warning in found.warnings]
        return words

    def _contradictions(self) -> list[str]:
        """What the model does not account for, with what to check."""
        found = self.desk.workup.findings if self.desk.workup else None
        told = found.contradictions if found else ()
        return [f"! {sentence(one.text)} Check: {sentence(one.check)}" for one in told]


def _pair_rows(found: Match) -> list[Row]:
    rows: list[Row] = [(f"pair-{pair.mode}", _pair_cells(pair)) for pair in found.pairs]
    for number, mode in enumerate(found.unpaired, start=1):
        measured = plus_minus(mode.frequency_hz, mode.frequency_sd_hz)
        cells = (DASH, measured, "no partner", DASH, DASH, DASH, mode.direction or "not said")
        rows.append((f"unpaired-{number}", cells))
    return rows


def _pair_cells(pair: Pair) -> tuple[str, ...]:
    measured = pair.measured
    return (
        str(pair.mode),
        plus_minus(measured.frequency_hz, measured.frequency_sd_hz),
        span_of(pair.low_hz, pair.high_hz),
        hertz(pair.prior_hz),
        hertz(pair.handbook_hz) if pair.handbook_hz is not None else DASH,
        f"{round(100 * (pair.model_hz / measured.frequency_hz - 1), 1) + 0.0:+.1f} %",
        pair.direction,
    )


def _parameter_rows(found: Match, units: str) -> list[Row]:
    told_first = sorted(found.parameters, key=lambda one: not one.informed)
    return [(one.name, _parameter_cells(one, units)) for one in told_first]


def _parameter_cells(one: ParameterReading, units: str) -> tuple[str, ...]:
    return (
        one.name,
        "✓ by tap" if one.informed else "· no",
        interval_bar(
            (one.prior_low, one.prior_median, one.prior_high), (one.low, one.median, one.high)
        ),
        interval(one.low, one.high, one.unit, units),
        interval(one.prior_low, one.prior_high, one.unit, units),
    )
