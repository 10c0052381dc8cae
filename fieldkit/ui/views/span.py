"""Span: the description as rows to edit, the drawing with a mode shape, and the computed modes."""

from __future__ import annotations

from itertools import zip_longest
from typing import TYPE_CHECKING, ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical
from textual.widgets import DataTable

from fieldkit.ui.forms import JobRow, rows_of
from fieldkit.ui.messages import AddWanted, EditWanted, RemoveWanted
from fieldkit.ui.motion import motion_wanted
from fieldkit.ui.span_marks import place_to_tap, tap_words
from fieldkit.ui.table import Row, Table
from fieldkit.ui.units import length
from fieldkit.ui.views.base import View, plain
from fieldkit.ui.views.fixed_span import draw_fixed, draw_plain
from fieldkit.ui.widgets import SpanDrawing
from fieldkit.ui.words import DASH, hertz, sentence, span_of

if TYPE_CHECKING:
    from fieldkit.span.modes import Mode
    from fieldkit.span.motion import TapPlace
    from fieldkit.workup import StateModes


class SpanView(View):
    """Description at the left, what it means at the right."""

    NAME = "span"
    HOME = "#rows"
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("e", "edit", "Edit", key_display="enter", id="span.edit",
                tooltip="Change the row under the cursor (enter or e)"),
        Binding("a", "add", "Add", id="span.add",
                tooltip="Add a leg, support, mass or excitation"),
        Binding("d,delete", "remove", "Remove", key_display="d", id="span.remove",
                tooltip="Take the row under the cursor out"),
        Binding("left", "mode(-1)", "Mode", key_display="←→", priority=True, id="span.mode-before",
                tooltip="Draw the mode before (left) or after (right)"),
        Binding("right", "mode(1)", "Next mode", show=False, priority=True, id="span.mode-after"),
        Binding("v", "turn", "View", id="span.turn",
                tooltip="See the span from another side; after the planes comes the free view"),
        Binding("space", "move", "Move", key_display="spc", id="span.move",
                tooltip="Let the mode shape swing, or hold it still"),
        Binding("shift+left", "turn_by(-15, 0)", "Turn", show=False, id="span.turn-left",
                tooltip="Turn the free view (shift and ←→↑↓)"),
        Binding("shift+right", "turn_by(15, 0)", "Turn", show=False, id="span.turn-right"),
        Binding("shift+up", "turn_by(0, 15)", "Tilt", show=False, id="span.tilt-up"),
        Binding("shift+down", "turn_by(0, -15)", "Tilt", show=False, id="span.tilt-down"),
        Binding("m", "state", "State", id="span.state",
                tooltip="Draw the span as tapped, as running, or with the chosen change"),
        Binding("p", "spacing", "Spacing", show=False, id="span.spacing",
                tooltip="How far apart equal supports may stand under this line"),
    ]  # fmt: skip

    def __init__(self) -> None:
        super().__init__()
        self.mode_number = 0
        self.drawn = "running"
        """``tapped``, ``running`` or ``fix``."""

    def compose(self) -> ComposeResult:
        """Rows beside drawing and modes."""
        with Horizontal(id="span-body"):
            yield Table("part", "as described", id="rows")
            with Vertical(id="span-right"):
                yield plain("drawn")
                yield SpanDrawing(id="drawing")
                yield Table("mode", "tapped", "running", "direction", "most at", id="computed")
                yield plain("handbook")

    def on_mount(self) -> None:
        """The shape swings by itself where that is wanted."""
        super().on_mount()
        self.query_one(SpanDrawing).moving = (
            motion_wanted() and not self.app.is_headless and not self.app.no_color
        )

    def draw(self) -> None:
        """Rows, modes, drawing, handbook."""
        self.table("#rows").fill(
            [(row.key, (row.label, row.value)) for row in rows_of(self.desk.text)]
        )
        self.table("#computed").fill(self._mode_rows())
        self._draw_shape()
        self.write("#handbook", self._handbook())

    @property
    def modes(self) -> tuple[Mode, ...]:
        """Modes of what is drawn."""
        if self._shows_fix:
            return self.desk.chosen_modes
        return self.desk.modes_of(self.drawn if self.drawn != "fix" else "running")

    @property
    def _shows_fix(self) -> bool:
        return self.drawn == "fix" and self.desk.chosen is not None

    def _draw_shape(self) -> None:
        modes = self.modes
        number = min(self.mode_number, len(modes) - 1)
        drawing = self.query_one(SpanDrawing)
        if self._shows_fix:
            draw_fixed(drawing, self.desk, number)
        else:
            draw_plain(drawing, self.desk, modes[number] if modes else None)
        self.write("#drawn", self._caption(number, modes))

    def _caption(self, number: int, modes: tuple[Mode, ...]) -> str:
        words = {"tapped": "As tapped", "running": "As running"}.get(self.drawn, "As running")
        if self._shows_fix and self.desk.chosen is not None:
            words = f"With change {self.desk.chosen.rank}, running"
        if not modes:
            return f"{words}: no mode to draw"
        mode = modes[number]
        drawn = (
            f"{words}, mode {number + 1} of {len(modes)}: "
            f"{hertz(mode.frequency_hz)} Hz {mode.direction}"
        )
        place = self._place_to_tap
        if place is None:
            return drawn
        return f"{drawn}\n{tap_words(place, lambda at_m: length(at_m, self.desk.units))}"

    @property
    def _place_to_tap(self) -> TapPlace | None:
        """Where a tap shows every mode of interest."""
        tapped = self.desk.modes_of("tapped")
        if self.desk.job is None or self._shows_fix:
            return None
        return place_to_tap(tapped, self.desk.job, self.desk.bands)

    def _mode_rows(self) -> list[Row]:
        pairs = zip_longest(self.desk.modes_of("tapped"), self.desk.modes_of("running"))
        return [
            (str(number), self._mode_cells(number, tapped, running))
            for number, (tapped, running) in enumerate(pairs, start=1)
        ]

    def _mode_cells(
        self, number: int, tapped: Mode | None, running: Mode | None
    ) -> tuple[str, ...]:
        known = running or tapped
        return (
            str(number),
            f"{hertz(tapped.frequency_hz)} Hz" if tapped else DASH,
            f"{hertz(running.frequency_hz)} Hz" if running else DASH,
            known.direction if known else DASH,
            length(known.where_m, self.desk.units) if known else DASH,
        )

    def _handbook(self) -> str:
        if self.desk.span_refused:
            return f"✗ {sentence(self.desk.span_refused)}"
        return "\n".join(handbook_line(state) for state in self.desk.states[-1:])

    def on_data_table_row_highlighted(self, event: DataTable.RowHighlighted) -> None:
        """The cursor in the table of modes chooses the mode that is drawn."""
        if event.data_table.id == "computed" and event.cursor_row != self.mode_number:
            self.mode_number = event.cursor_row
            self._draw_shape()

    def on_data_table_row_selected(self, event: DataTable.RowSelected) -> None:
        """Enter on a row edits it."""
        if event.data_table.id == "rows":
            self.action_edit()

    def action_mode(self, step: int) -> None:
        """Draw another mode."""
        count = len(self.modes)
        if count:
            self.mode_number = (min(self.mode_number, count - 1) + step) % count
            self.table("#computed").choose(str(self.mode_number + 1))
            self._draw_shape()

    def action_turn(self) -> None:
        """See the span from another side."""
        self.query_one(SpanDrawing).action_turn()

    def action_turn_by(self, turn_deg: int, tilt_deg: int) -> None:
        """Turn and tilt the free view."""
        self.query_one(SpanDrawing).action_turn_by(turn_deg, tilt_deg)

    def action_move(self) -> None:
        """Let the shape swing, or hold it still."""
        self.query_one(SpanDrawing).action_move()

    def action_state(self) -> None:
        """Draw the next state."""
        order = ["tapped", "running", *(["fix"] if self.desk.chosen else [])]
        here = order.index(self.drawn) if self.drawn in order else -1
        self.drawn = order[(here + 1) % len(order)]
        self._draw_shape()

    def action_spacing(self) -> None:
        """Frequency against equal spacing, in a window."""
        from fieldkit.ui.worked_screen import spacing_window

        if self.desk.job is None:
            self.notify("There is no job yet.", severity="warning")
            return
        self.app.push_screen(spacing_window(self.desk.job, self.desk.workup))

    def action_edit(self) -> None:
        """Change the row under the cursor."""
        if (row := self._row()) is not None:
            self.post_message(EditWanted(row.table, row.index))

    def action_add(self) -> None:
        """Add a row; the cursor's table is offered first."""
        row = self._row()
        self.post_message(AddWanted(row.table if row and row.index is not None else ""))

    def action_remove(self) -> None:
        """Take the row under the cursor out."""
        row = self._row()
        if row is None:
            return
        if row.index is None:
            self.app.notify("This part can be changed, not removed.", severity="warning")
            return
        self.post_message(RemoveWanted(row.table, row.index))

    def _row(self) -> JobRow | None:
        key = self.table("#rows").chosen
        return next((row for row in rows_of(self.desk.text) if row.key == key), None)


def handbook_line(state: StateModes) -> str:
    """The handbook estimate of a state with its formula and source."""
    found = state.handbook
    if found is None:
        return f"Handbook, {state.state}: {sentence(state.handbook_refused)}"
    return (
        f"Handbook, {state.state}: {hertz(found.frequency_hz)} Hz "
        f"({span_of(found.low_hz, found.high_hz)}), {found.formula}. {sentence(found.source)}"
    )
