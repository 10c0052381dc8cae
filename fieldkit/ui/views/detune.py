"""Detune: the bands, the chance as it is, the ranked changes, and the one under the cursor."""

from __future__ import annotations

from typing import TYPE_CHECKING, ClassVar

from textual import work
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical, VerticalScroll
from textual.widgets import DataTable

from fieldkit.sheet.plain import percent
from fieldkit.ui.diagnosis_words import first_verdict, in_short
from fieldkit.ui.messages import AdoptWanted, FixChosen
from fieldkit.ui.plots import SHORT
from fieldkit.ui.table import Row, Table
from fieldkit.ui.views.base import View, plain
from fieldkit.ui.views.fixed_span import draw_fixed
from fieldkit.ui.widgets import SpanDrawing
from fieldkit.ui.words import DASH, hertz, ratio_percent, sentence, span_of

if TYPE_CHECKING:
    from fieldkit.detune.verdict import Detuning, Nearest, Verdict


class DetuneView(View):
    """Question above, answers in the middle, the chosen answer below."""

    NAME = "detune"
    HOME = "#fixes"
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("a", "adopt", "Adopt", id="detune.adopt",
                tooltip="Write the chosen change into the job, after asking"),
        Binding("m", "map", "Map", id="detune.map",
                tooltip="The chance of every place and size of a new support or mass"),
        Binding("c", "curves", "Curves", id="detune.curves",
                tooltip="Modes and chance as the chosen change is moved, stiffer or heavier"),
        Binding("i", "install", "Install", key_display="enter", id="detune.install",
                tooltip="What it takes to install the chosen change (enter or i)"),
        Binding("p", "recheck", "Recheck", id="detune.recheck",
                tooltip="Hold the chosen change, once installed, against taps made after it"),
    ]  # fmt: skip

    def compose(self) -> ComposeResult:
        """Text, table, and table beside text."""
        yield plain("question")
        yield Table("#", "chance", "effort", "apart", "nearest band", "change", id="fixes")
        with Horizontal(classes="lower"):
            yield Table("#", "now Hz", "after 90 %", "dir", "clear", id="after")
            with Vertical(id="fix-side"):
                with VerticalScroll(id="fix-words", can_focus=True):
                    yield plain("fix-text")
                yield SpanDrawing(id="fix-drawing")

    def draw(self) -> None:
        """Everything but the cursor, which stays where it was."""
        found = self._found
        self.write("#question", self._question(found))
        fixes = self.table("#fixes")
        fixes.fill(self._fix_rows(found) if found else [])
        if self.desk.chosen is not None:
            fixes.choose(str(self.desk.chosen.rank))
        self._draw_chosen()

    @property
    def _found(self) -> Detuning | None:
        return self.desk.workup.detuning if self.desk.workup else None

    @property
    def chosen(self) -> Verdict | None:
        """The fix under the cursor."""
        found, key = self._found, self.table("#fixes").chosen
        if found is None:
            return None
        return next((fix for fix in found.fixes if str(fix.rank) == key), None)

    def on_data_table_row_highlighted(self, event: DataTable.RowHighlighted) -> None:
        """A fix under the cursor is the chosen one."""
        if event.data_table.id != "fixes":
            return
        self._draw_chosen()
        if self.chosen is not None:
            self.post_message(FixChosen(self.chosen))

    def on_data_table_row_selected(self, event: DataTable.RowSelected) -> None:
        """Enter on a fix tells what it takes."""
        if event.data_table.id == "fixes":
            self.action_install()

    def action_install(self) -> None:
        """Brackets, loads, heat and cautions of the chosen fix, in a window."""
        from fieldkit.ui.worked_screen import install_window

        if self.chosen is None or self.desk.workup is None:
            self.notify("No change is chosen.", severity="warning")
            return
        self.app.push_screen(install_window(self.desk.workup, self.chosen))

    @work
    async def action_recheck(self) -> None:
        """Taps made after the chosen change was installed, held against the promise."""
        from fieldkit.ui.recheck_screen import open_recheck

        await open_recheck(self.app, self.desk, self.chosen)

    def action_map(self) -> None:
        """The chance map; the change chosen on it goes the way of any other."""
        from fieldkit.ui.chance_screen import ChanceScreen

        work = self.desk.workup
        if self.desk.job is None or work is None or work.detuning is None:
            self.notify("The map comes with the ranked changes.", severity="warning")
            return
        self.app.push_screen(ChanceScreen(self.desk.job, work.match), self._from_map)

    def action_curves(self) -> None:
        """The curves of the chosen change; a value taken from them goes the way of any change."""
        from fieldkit.ui.curve_screen import CurveScreen

        work = self.desk.workup
        if self.desk.job is None or work is None or self.chosen is None:
            self.notify("No change is chosen.", severity="warning")
            return
        self.app.push_screen(CurveScreen(self.desk.job, work.match, self.chosen), self._from_map)

    def _from_map(self, verdict: Verdict | None) -> None:
        if verdict is not None:
            self.post_message(AdoptWanted(verdict))

    def action_adopt(self) -> None:
        """Ask for the chosen fix to be written into the job."""
        if self.chosen is None:
            self.notify("No change is chosen.", severity="warning")
            return
        self.post_message(AdoptWanted(self.chosen))

    def _fix_rows(self, found: Detuning) -> list[Row]:
        return [(str(fix.rank), self._fix_cells(fix)) for fix in found.fixes]

    def _fix_cells(self, fix: Verdict) -> tuple[str, ...]:
        from fieldkit.detune.effort import effort

        size = effort(fix.change, self.desk.job.span) if self.desk.job else 0.0
        return (
            str(fix.rank),
            percent(fix.chance),
            f"{size:.1f}",
            ratio_percent(fix.nearest.separation),
            fix.nearest.band,
            fix.summary,
        )

    def _question(self, found: Detuning | None) -> str:
        listed = ", ".join(f"{b.name} {span_of(b.low_hz, b.high_hz)}" for b in self.desk.bands)
        if not listed:
            return "No excitation is described yet: add one in Span (3), a"
        margin = ratio_percent(self.desk.job.goal.margin) if self.desk.job else ""
        bands = f"Keep {margin} clear of {listed} Hz"
        if found is None:
            return bands
        nearest = f", nearest {_nearest(found.nearest_now)}" if found.nearest_now else ""
        first = first_verdict(self.desk)
        verdict = f"{in_short(first)}\n" if first else ""
        return f"{verdict}Now: {percent(found.chance_now)} chance of being clear{nearest}\n{bands}"

    def _draw_chosen(self) -> None:
        found, fix = self._found, self.chosen
        self.table("#after").fill(_mode_rows(found, fix) if found else [])
        self.write("#fix-text", "\n".join(self._words(found, fix)))
        draw_fixed(self.query_one(SpanDrawing), self.desk)

    def _words(self, found: Detuning | None, fix: Verdict | None) -> list[str]:
        if found is None:
            return [sentence(text) for text in self.desk.refusals("detune")]
        return [
            *self._shortfall(found),
            *(_fix_words(fix, self._answer_to_orders(fix)) if fix else []),
            *_living_with_it(found),
            *map(sentence, found.warnings),
        ]

    def _answer_to_orders(self, fix: Verdict) -> str:
        """Amplification of each order now and with the change."""
        from fieldkit.sheet.order_response import words
        from fieldkit.workup.order_response import order_response

        return words(order_response(self.desk.workup, fix)) if self.desk.workup else ""

    def _shortfall(self, found: Detuning) -> list[str]:
        """Said plainly when nothing reaches what was wanted."""
        wanted = self.desk.job.goal.chance if self.desk.job else 0.9
        best = max((fix.chance for fix in found.fixes), default=0.0)
        if found.chance_now >= wanted:
            return [f"No change is needed: {percent(wanted)} was wanted."]
        if best >= wanted:
            return []
        return [
            f"No change reaches the {percent(wanted)} wanted; the best reaches {percent(best)}. "
            "Another speed, added damping or an absorber may; a better tap narrows the doubt.",
            *self._better_tap(),
        ]

    def _better_tap(self) -> list[str]:
        """The measurement that would make a change surer."""
        found = self.desk.workup.findings if self.desk.workup else None
        return [f"Next: {sentence(found.next_measurement)}"] if found and found.blows else []


def _nearest(nearest: Nearest) -> str:
    return f"{nearest.band}, {ratio_percent(nearest.separation)} apart"


def _mode_rows(found: Detuning, fix: Verdict | None) -> list[Row]:
    after = fix.modes_after if fix else ()
    rows: list[Row] = []
    for i in range(max(len(found.modes), len(after))):
        now = hertz(found.modes[i].median_hz) if i < len(found.modes) else DASH
        mode = after[i] if i < len(after) else found.modes[i]
        then = span_of(mode.low_hz, mode.high_hz) if i < len(after) else DASH
        rows.append(
            (
                str(i + 1),
                (
                    str(i + 1),
                    now,
                    then,
                    SHORT.get(mode.direction, mode.direction),
                    percent(mode.chance_clear),
                ),
            )
        )
    return rows


def _living_with_it(found: Detuning) -> list[str]:
    """Cures that leave the mode in its band, with what their chance means."""
    said = []
    for cure in found.other_cures:
        said.append(f"~ {sentence(cure.summary)}")
        if cure.chance is not None:
            said.append(f"  {percent(cure.chance)} chance that {sentence(cure.chance_means)}")
    return ["Living with it:", *said] if said else []


def _fix_words(fix: Verdict, amplified: str) -> list[str]:
    cautions = [f"! {sentence(caution)}" for caution in fix.cautions]
    reasons = [sentence(text) for text in (fix.why, fix.fails) if text]
    return [
        sentence(fix.summary),
        *reasons[:1],
        *([amplified] if amplified else []),
        *reasons[1:],
        *cautions,
    ]
