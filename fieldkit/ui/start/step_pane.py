"""One step of the guided path: its fields, what they offer, and the rows it has so far."""

from __future__ import annotations

from collections.abc import Awaitable, Callable, Mapping
from typing import TYPE_CHECKING, ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical
from textual.content import Content
from textual.message import Message
from textual.widgets import DataTable, Static

from fieldkit.ui.forms.fields import FieldRow, Fields
from fieldkit.ui.start.steps import Step, row_words
from fieldkit.ui.table import Row, Table
from fieldkit.ui.words import safe

if TYPE_CHECKING:
    from fieldkit.job.draft import Answers, Draft

Objection = Callable[[str, tuple[Mapping[str, str], ...]], str]
"""Tries rows (or the one row of a single step) on the job; a sentence where they do not fit."""


async def _stay() -> None:
    """Nowhere to go on to yet."""


class StepPane(Vertical):
    """Fields above, rows below; nothing typed is ever thrown away."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("ctrl+d,ctrl+delete", "remove_row", "Remove", show=False, priority=True,
                id="guided.remove"),
    ]  # fmt: skip

    class Changed(Message):
        """The answers are other ones."""

    def __init__(self, step: Step, draft: Draft, objection: Objection) -> None:
        super().__init__(id=f"pane-{step.table}", classes="step-pane")
        self.step = step
        self.units = draft.units
        self.objection = objection
        self.done: Callable[[], Awaitable[None]] = _stay
        """Called where the user wants to go on."""
        self.rows: list[Answers] = list(draft.of(step.table))
        self.at = min(draft.at.get(step.table, len(self.rows)), len(self.rows))
        """The row in hand; one past the last for a new one."""
        self.first = self._first(draft)

    def _first(self, draft: Draft) -> Answers:
        if not self.step.repeated:
            return draft.pipe if self.step.table == "pipe" else draft.goal
        return draft.half.get(self.step.table, {})

    def compose(self) -> ComposeResult:
        """Question, fields, what is said of them, rows."""
        yield Static(self.step.question, markup=False, classes="question-line")
        yield Fields(self.step.form, self.first, self.units)
        yield Static("", markup=False, classes="step-says")
        if self.step.repeated:
            yield Table(self.step.title, "as typed", id=f"rows-{self.step.table}")

    def on_mount(self) -> None:
        """The rows as they were left."""
        self.fields.entered = self.entered
        if self.step.repeated:
            self.table.show_header = False
            self._list()

    @property
    def fields(self) -> Fields:
        """What is typed into."""
        return self.query_one(Fields)

    @property
    def table(self) -> Table:
        """The rows."""
        return self.query_one(Table)

    @property
    def values(self) -> dict[str, str]:
        """What stands in the fields, empty ones left out."""
        return {key: text for key, text in self.fields.values.items() if text}

    def start(self) -> None:
        """Put the keyboard where it was needed last."""
        wanting = (row for row in self.fields.rows if row.error)
        row = next(wanting, self.fields.rows[0]) if self.values else self.fields.rows[0]
        self.screen.set_focus(row.input)

    def on_fields_typed(self, message: Fields.Typed) -> None:
        """Tell of every key press."""
        message.stop()
        self.post_message(self.Changed())

    def on_fields_explained(self, message: Fields.Explained) -> None:
        """What the field in hand has to say."""
        message.stop()
        self.say(message.sentence, wrong=message.wrong)

    def say(self, sentence: str, *, wrong: bool = False) -> None:
        """One sentence under the fields."""
        says = self.query_one(".step-says", Static)
        says.update(Content(safe(sentence)))
        says.set_class(wrong, "-wrong")

    async def entered(self, row: FieldRow, _chose: bool) -> None:
        """To the next field; from the last one the row is taken; an empty new row goes on."""
        if self.step.repeated and not self.values and self.at == len(self.rows):
            await self.done()
        elif row.error and row.text:
            self.say(f"✗ {row.error}", wrong=True)
        elif row is not self.fields.rows[-1]:
            self.screen.focus_next()
        elif not self.step.repeated:
            await self.done()
        elif self.take():
            self.fields.focus_on(self.step.form.fields[0].key)

    def take(self) -> bool:
        """Put the row in hand into the list; False, and a sentence, where it does not fit."""
        wrong = self.fields.first_wrong
        if wrong is not None:
            self.screen.set_focus(wrong.input)
            self.call_after_refresh(self.say, f"✗ {wrong.error}", wrong=True)
            return False
        rows = list(self.rows)
        rows[self.at : self.at + 1] = [self.values]
        objection = self.objection(self.step.table, tuple(rows))
        if objection:
            self.call_after_refresh(self.say, f"✗ {objection}", wrong=True)
            return False
        number, self.rows = self.at + 1, rows
        self._new_row()
        said = f"✓ {self.step.form.title} {number} is in. Enter on an empty line goes on."
        self.call_after_refresh(self.say, said)
        return True

    def settled(self) -> bool:
        """Whether the next step may come; takes what is half typed, and says what is missing."""
        if not self.step.repeated:
            return self._single_settled()
        if self.values and not self.take():
            return False
        if len(self.rows) < self.step.least:
            self.say(f"✗ {self.step.empty}", wrong=True)
            return False
        return True

    def _single_settled(self) -> bool:
        wrong = self.fields.first_wrong
        objection = wrong.error if wrong else self.objection(self.step.table, (self.values,))
        if objection:
            if wrong is not None:
                self.screen.set_focus(wrong.input)
            self.call_after_refresh(self.say, f"✗ {objection}", wrong=True)
        return not objection

    def _new_row(self) -> None:
        self.at = len(self.rows)
        self.fields.put({})
        self._list()
        self.post_message(self.Changed())

    def _list(self) -> None:
        self.table.fill(self._lines())
        self.table.choose(str(self.at))

    def _lines(self) -> list[Row]:
        title = self.step.form.title
        lines: list[Row] = [
            (str(number), (f"{'▶' if number == self.at else ' '} {title} {number + 1}",
                           row_words(self.step, row)))
            for number, row in enumerate(self.rows)
        ]  # fmt: skip
        mark = "▶" if self.at == len(self.rows) else "+"
        said = "" if self.rows else self.step.empty
        return [*lines, (str(len(self.rows)), (f"{mark} new", said))]

    def on_data_table_row_selected(self, event: DataTable.RowSelected) -> None:
        """Enter or a click on a row takes it into the fields again."""
        event.stop()
        self.pick(event.cursor_row)

    def pick(self, number: int) -> None:
        """Another row into the fields; what is half typed goes into the list first."""
        if number == self.at or (self.values and not self.take()):
            return
        self.at = min(number, len(self.rows))
        self.fields.put(self.rows[self.at] if self.at < len(self.rows) else {})
        self._list()
        self.fields.focus_on(self.step.form.fields[0].key)
        self.post_message(self.Changed())

    def action_remove_row(self) -> None:
        """Take out the row in hand, or the one the list points at."""
        if not self.step.repeated:
            return
        pointed = self.table.cursor_row if self.table.has_focus else self.at
        if pointed < len(self.rows):
            gone = row_words(self.step, self.rows.pop(pointed))
            self._new_row()
            self.say(f"Taken out: {gone}")
        else:
            self.fields.put({})
